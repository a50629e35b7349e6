// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/maths/parabola_fit.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <vector>

#include "tonewalk/maths/least_squares.hpp"

namespace tonewalk {
namespace {

/// Standard deviation of a value that leans on the coefficients by `slope`.
double sigma_along(const linear_fit& fit, const std::array<double, 3>& slope) {
    double variance = 0.0;
    for (std::size_t a = 0; a < slope.size(); ++a) {
        for (std::size_t b = 0; b < slope.size(); ++b) {
            variance += slope[a] * fit.covariance_of(a, b) * slope[b];
        }
    }
    return std::sqrt(std::max(0.0, variance));
}

} // namespace

std::optional<parabola_vertex> fit_parabola(std::span<const weighted_value> points,
                                            double correlation_factor) {
    if (points.size() < 4) {
        return std::nullopt;
    }
    // Centred and scaled, so that the fit is well conditioned whatever the unit of x.
    const double middle = 0.5 * (points.front().x + points.back().x);
    double reach = 0.0, highest = 0.0;
    for (const weighted_value& p : points) {
        reach = std::max(reach, std::abs(p.x - middle));
        highest = std::max(highest, std::abs(p.y));
    }
    if (reach <= 0.0) {
        return std::nullopt;
    }
    std::vector<double> design, y, sigmas;
    for (const weighted_value& p : points) {
        const double u = (p.x - middle) / reach;
        design.insert(design.end(), {1.0, u, u * u});
        y.push_back(p.y);
        sigmas.push_back(p.sigma);
    }
    const std::optional<linear_fit> fit = fit_linear(design, y, sigmas);
    constexpr double rounding = 1e-12;
    if (!fit || !(std::abs(fit->coefficients[2]) > rounding * highest)) {
        return std::nullopt;
    }
    const std::vector<double>& c = fit->coefficients;
    const double u0 = -c[1] / (2.0 * c[2]), spread = std::sqrt(correlation_factor);
    parabola_vertex v;
    v.x = middle + reach * u0;
    v.y = c[0] + c[1] * u0 + c[2] * u0 * u0;
    v.x_sigma = spread * reach * sigma_along(*fit, {0.0, -0.5 / c[2], -u0 / c[2]});
    v.y_sigma = spread * sigma_along(*fit, {1.0, u0, u0 * u0});
    v.bend = 2.0 * c[2] / (reach * reach);
    return v;
}

} // namespace tonewalk
