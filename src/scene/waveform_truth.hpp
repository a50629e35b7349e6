// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <vector>

#include "tonewalk/scene/scene.hpp"

namespace tonewalk {

/// What the modulation makes of an unmodulated carrier of amplitude 1.
struct waveform_truth {
    double line = 1.0;         ///< the carrier line's amplitude
    std::vector<double> tones; ///< of each tone in the envelope; 0 where it does not sound
};
/// For the tones that sound at a time; NaN where several are pinched off together.
[[nodiscard]] waveform_truth waveform_at(const scene_carrier&, double time_s);

/// Whether the waveform of all tones and hum together can pass below zero.
[[nodiscard]] bool overmodulated(const scene_carrier&);

} // namespace tonewalk
