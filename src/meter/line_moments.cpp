// SPDX-License-Identifier: GPL-3.0-or-later
#include "line_moments.hpp"

#include <algorithm>
#include <cmath>
#include <numbers>

namespace tonewalk {
namespace {

constexpr double pi = std::numbers::pi;

} // namespace

line_moments::line_moments(std::span<const cf32> samples, std::span<const double> window,
                           double rate_hz, double f0_hz, std::size_t order)
    : coefficients_(order + 1), f0_hz_{f0_hz}, window_s_{static_cast<double>(samples.size()) /
                                                         rate_hz} {
    const double half = static_cast<double>(samples.size()) / 2.0;
    const cf64 step = std::polar(1.0, -2.0 * pi * f0_hz / rate_hz);
    cf64 turn = std::polar(1.0, 2.0 * pi * f0_hz / rate_hz * half);
    for (std::size_t n = 0; n < samples.size(); ++n) {
        const double t = (static_cast<double>(n) - half) / half;
        const double re = static_cast<double>(samples[n].real()),
                     im = static_cast<double>(samples[n].imag());
        double yr = window[n] * (re * turn.real() - im * turn.imag());
        double yi = window[n] * (re * turn.imag() + im * turn.real());
        for (cf64& moment : coefficients_) {
            moment += cf64{yr, yi};
            yr *= t;
            yi *= t;
        }
        turn = cf64{turn.real() * step.real() - turn.imag() * step.imag(),
                    turn.real() * step.imag() + turn.imag() * step.real()};
    }
    cf64 factor{1.0, 0.0};
    for (std::size_t p = 1; p < coefficients_.size(); ++p) {
        factor *= cf64{0.0, -1.0 / static_cast<double>(p)};
        coefficients_[p] *= factor;
    }
}

cf64 line_moments::at(double hz) const noexcept {
    const double theta = pi * (hz - f0_hz_) * window_s_;
    cf64 sum{};
    for (auto c = coefficients_.rbegin(); c != coefficients_.rend(); ++c) {
        sum = sum * theta + *c;
    }
    return sum;
}

line_moments::series line_moments::derivatives(double hz) const noexcept {
    const double per_hz = pi * window_s_;
    const double theta = per_hz * (hz - f0_hz_);
    series s{};
    for (auto c = coefficients_.rbegin(); c != coefficients_.rend(); ++c) {
        s.second = s.second * theta + 2.0 * s.first;
        s.first = s.first * theta + s.value;
        s.value = s.value * theta + *c;
    }
    return {s.value, s.first * per_hz, s.second * per_hz * per_hz};
}

std::size_t moment_order(double window_s, double most_offset_hz) noexcept {
    constexpr std::size_t least = 6, most = 40;
    const double theta = pi * most_offset_hz * window_s;
    double term = 1.0;
    std::size_t order = 0;
    while (order < least || (order < most && term > 1e-10)) {
        ++order;
        term *= theta / static_cast<double>(order);
    }
    return order;
}

double hann_response(double bins) noexcept {
    const double x = std::abs(bins);
    if (x < 1e-6) {
        return 1.0;
    }
    if (std::abs(x - 1.0) < 1e-6) {
        return 0.5;
    }
    return std::sin(pi * x) / (pi * x) / (1.0 - x * x);
}

double hann_leakage_bound(double bins) noexcept {
    const double x = std::abs(bins);
    return x < 2.0 ? std::max(std::abs(hann_response(x)), 0.03) : 1.0 / (pi * x * (x * x - 1.0));
}

} // namespace tonewalk
