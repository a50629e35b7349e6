// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include "line_spectrum.hpp"
#include "search_opening.hpp"

namespace tonewalk {

/// Amplitude of the receiver's line at 0 Hz: a line of the survey, or of a finer one where the
/// carrier stands within 6 bins, whose phase stays put, and that is no sideband of the carrier. 0
/// where there is none, or the carrier stands too near to tell.
[[nodiscard]] double dc_line(const looked_at&, const line_spectrum& survey, double carrier_hz);

} // namespace tonewalk
