// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <optional>
#include <vector>

#include "tonewalk/base/note.hpp"
#include "tonewalk/base/quantity.hpp"
#include "tonewalk/base/sheet.hpp"
#include "tonewalk/channel/iq_balance.hpp"
#include "tonewalk/channel/plan.hpp"
#include "tonewalk/recording/stream.hpp"

namespace tonewalk {

/// What the user says about the signal; empty: find it.
struct search_request {
    std::optional<signed_hz> carrier{}; ///< a starting point: the strongest line near it is taken
    std::optional<double> tone_hz{};    ///< likewise, within 2 %
    std::optional<double> width_hz{};   ///< flat width of the channel
    bool mend_iq = false;               ///< take the receiver's image out first
};

struct found_tone {
    double frequency_hz = 0.0;
    double depth_percent = 0.0;
};

/// A carrier that stands out of the noise in the opening.
struct found_carrier {
    double offset_hz = 0.0; ///< from the recording's centre
    double level_dbfs = not_measured;
    double carrier_to_noise_density_dbhz = not_measured;
    std::vector<found_tone> tones;     ///< the chosen one first; empty: none steady
    bool modulated_unsteadily = false; ///< in step with the carrier, but not by a steady tone
    double width_hz = not_measured;    ///< that a channel for it takes; NaN: the band ends before
};

struct found_signal {
    std::vector<found_carrier> carriers; ///< strongest first
    double offset_hz = 0.0; ///< of the chosen one, from the centre of the first stretch
    std::optional<double> tone_hz;
    double width_hz = 0.0;
    channel_plan plan;
    double dc_amplitude = 0.0; ///< of the line at the centre, full scale = 1
    /// Amplitude of the image over the signal's, at most, after mending; 0 where the carrier is
    /// further from the centre than its width, or nothing shows an image.
    double image_ratio = 0.0;
    std::optional<iq_balance> mended; ///< what was taken out, for front_end::make
    note_set notes;
    curve spectrum; ///< averaged, x Hz from the centre, y dBFS a bin
};

/// Looks for carrier and test tone in the opening: the first 2 s, or 32 MiB, of what is to be
/// measured (docs/measurements.md, "Finding the signal"). Throws error{bad_request} for an absolute
/// carrier without a centre, error{malformed} when a carrier, tone or width does not fit the band,
/// nothing is found, or no image can be fitted that was to be taken out.
[[nodiscard]] found_signal find_signal(block_source&, const search_request&);

} // namespace tonewalk
