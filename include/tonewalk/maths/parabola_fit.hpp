// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <optional>
#include <span>

namespace tonewalk {

struct weighted_value {
    double x = 0.0, y = 0.0;
    double sigma = 1.0; ///< standard deviation of y, > 0
};

/// The turning point of a parabola through weighted points, with its standard deviations.
struct parabola_vertex {
    double x = 0.0, y = 0.0;
    double x_sigma = 0.0, y_sigma = 0.0;
    double bend = 0.0; ///< second derivative: negative at a peak
};
/// Weighted least squares of c0 + c1 x + c2 x^2; covariance from the sigmas, times
/// `correlation_factor`. Nothing where fewer than four points or no bend is left.
[[nodiscard]] std::optional<parabola_vertex> fit_parabola(std::span<const weighted_value>,
                                                          double correlation_factor = 1.0);

} // namespace tonewalk
