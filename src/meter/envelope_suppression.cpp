// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/meter/envelope_suppression.hpp"

#include <cmath>

namespace tonewalk {
namespace {

/// I1(x) / I0(x), x >= 0.
double bessel_ratio(double x) {
    constexpr double asymptotic_from = 50.0;
    if (x > asymptotic_from) {
        return 1.0 - 1.0 / (2.0 * x) - 1.0 / (8.0 * x * x) - 1.0 / (8.0 * x * x * x);
    }
    return std::cyl_bessel_i(1.0, x) / std::cyl_bessel_i(0.0, x);
}

} // namespace

double envelope_depth_factor(double carrier_to_noise) noexcept {
    if (!(carrier_to_noise > 0.0)) {
        return 0.0;
    }
    const double s = carrier_to_noise;
    const double ratio = bessel_ratio(s / 2.0);
    return s * (1.0 + ratio) / (1.0 + s + s * ratio);
}

} // namespace tonewalk
