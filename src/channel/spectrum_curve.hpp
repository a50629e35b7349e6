// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include "line_spectrum.hpp"
#include "tonewalk/base/sheet.hpp"
#include "tonewalk/recording/stream.hpp"

namespace tonewalk {

/// Some 1000 points, Hz from the recording's centre against dBFS a bin, each the highest of its
/// run.
[[nodiscard]] curve spectrum_curve(const line_spectrum&, const stream_facts&,
                                   double centre_shift_hz);

} // namespace tonewalk
