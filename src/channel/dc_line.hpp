// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include "line_spectrum.hpp"
#include "search_opening.hpp"

namespace tonewalk {

/// Amplitude of the receiver's line at 0 Hz: a line of the survey whose phase stays put, and that
/// is no sideband of the carrier. 0 where there is none.
[[nodiscard]] double dc_line(const looked_at&, const line_spectrum& survey, double carrier_hz);

} // namespace tonewalk
