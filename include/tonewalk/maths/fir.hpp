// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <span>
#include <vector>

namespace tonewalk {

/// A linear-phase low-pass by the Kaiser window.
struct low_pass_design {
    double rate_hz = 0.0;      ///< > 0
    double pass_edge_hz = 0.0; ///< flat up to here
    double stop_edge_hz = 0.0; ///< attenuation from here on; pass < stop <= rate/2
    double attenuation_db = 100.0;
    std::size_t half_multiple_of = 1; ///< (taps - 1)/2 is a multiple of this
};
/// Odd number of taps, symmetric, sum 1. Throws error{bad_request} on edges out of order.
[[nodiscard]] std::vector<double> design_low_pass(const low_pass_design&);

/// Amplitude response of symmetric taps at `hz` (real: delay taken off).
[[nodiscard]] double symmetric_response(std::span<const double> taps, double rate_hz,
                                        double hz) noexcept;

} // namespace tonewalk
