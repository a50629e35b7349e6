// SPDX-License-Identifier: GPL-3.0-or-later
#include "line_moments.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>

namespace tonewalk {
namespace {

using std::numbers::pi;
constexpr std::size_t most_order = 40;

/// Sum in 8 fixed lanes, so that several are added at a time.
double sum_of(const run_values& values) noexcept {
    constexpr std::size_t lanes = 8;
    std::array<double, lanes> sums{};
    for (std::size_t first = 0; first < run_samples; first += lanes) {
        for (std::size_t k = 0; k < lanes; ++k) {
            sums[k] += values[first + k];
        }
    }
    return ((sums[0] + sums[4]) + (sums[2] + sums[6])) +
           ((sums[1] + sums[5]) + (sums[3] + sums[7]));
}

void multiply(run_values& values, const run_values& by) noexcept {
    for (std::size_t k = 0; k < run_samples; ++k) {
        values[k] *= by[k];
    }
}

/// `run` times the phasor's table, phase 0 at its first sample.
sample_runs::run turned(const sample_runs::run& run, const sample_runs::run& table) noexcept {
    sample_runs::run z;
    for (std::size_t k = 0; k < run_samples; ++k) {
        z.re[k] = run.re[k] * table.re[k] - run.im[k] * table.im[k];
        z.im[k] = run.re[k] * table.im[k] + run.im[k] * table.re[k];
    }
    return z;
}

/// Sample times in a run, from its middle, in half runs.
run_values times_in_run() noexcept {
    constexpr double half = static_cast<double>(run_samples) / 2.0;
    run_values t{};
    for (std::size_t k = 0; k < run_samples; ++k) {
        t[k] = (static_cast<double>(k) - half) / half;
    }
    return t;
}

std::size_t terms_until(double theta, double tolerance, std::size_t least) noexcept {
    double term = 1.0;
    std::size_t order = 0;
    while (order < least || (order < most_order && term > tolerance)) {
        ++order;
        term *= theta / static_cast<double>(order);
    }
    return order;
}

} // namespace

moment_orders orders_reaching(double most_offset_hz, double window_s, double rate_hz) noexcept {
    const double run_s = static_cast<double>(run_samples) / rate_hz;
    const std::size_t window = terms_until(pi * most_offset_hz * window_s, 1e-10, 6);
    return {window, std::min(window, terms_until(pi * most_offset_hz * run_s, 1e-10, 2))};
}

/// A run's few moments about its own middle give those about the window's:
/// multiplying by t = middle + half_run x t_run takes moment q to middle x (q)
/// + half_run x (q + 1).
line_moments::line_moments(const sample_runs& weighted, double rate_hz, double f0_hz,
                           const moment_orders& orders)
    : coefficients_(orders.window + 1), f0_hz_{f0_hz}, window_s_{
                                                           static_cast<double>(weighted.samples()) /
                                                           rate_hz} {
    static const run_values times = times_in_run();
    const double half_window = static_cast<double>(weighted.samples()) / 2.0;
    const double half_run = static_cast<double>(run_samples) / 2.0 / half_window;
    run_phasor phasor{-f0_hz / rate_hz, std::polar(1.0, 2.0 * pi * f0_hz / rate_hz * half_window)};
    double middle = half_run - 1.0;
    std::array<cf64, most_order + 2> local{}; // one above the order stays zero
    for (const sample_runs::run& run : weighted.runs()) {
        sample_runs::run z = turned(run, phasor.table());
        for (std::size_t q = 0; q <= orders.run; ++q) {
            local[q] = product(phasor.now(), {sum_of(z.re), sum_of(z.im)});
            multiply(z.re, times);
            multiply(z.im, times);
        }
        for (cf64& moment : coefficients_) {
            moment += local[0];
            for (std::size_t q = 0; q <= orders.run; ++q) {
                local[q] = middle * local[q] + half_run * local[q + 1];
            }
        }
        middle += 2.0 * half_run;
        phasor.next_run();
    }
    cf64 factor{1.0, 0.0};
    for (std::size_t p = 1; p < coefficients_.size(); ++p) {
        factor *= cf64{0.0, -1.0 / static_cast<double>(p)};
        coefficients_[p] *= factor;
    }
}

cf64 line_moments::derivative(double hz, std::size_t order) const noexcept {
    const double theta = pi * (hz - f0_hz_) * window_s_;
    cf64 sum{};
    for (std::size_t p = coefficients_.size(); p-- > order;) {
        double falling = 1.0; // p (p - 1) ...
        for (std::size_t k = 0; k < order; ++k) {
            falling *= static_cast<double>(p - k);
        }
        sum = sum * theta + falling * coefficients_[p];
    }
    return sum;
}

cf64 line_moments::at(double hz, double slope_hz_s) const noexcept {
    // The drift's phase is kappa u^2, and every u^2 is two derivatives by theta.
    constexpr double negligible = 1e-7;
    const cf64 kappa{0.0, pi * slope_hz_s * window_s_ * window_s_ / 4.0};
    cf64 sum{}, factor{1.0, 0.0};
    for (std::size_t q = 0; 2 * q < coefficients_.size() && std::abs(factor) > negligible; ++q) {
        sum += factor * derivative(hz, 2 * q);
        factor *= kappa / static_cast<double>(q + 1);
    }
    return sum;
}

line_moments::series line_moments::derivatives(double hz) const noexcept {
    const double per_hz = pi * window_s_;
    return {derivative(hz, 0), derivative(hz, 1) * per_hz, derivative(hz, 2) * per_hz * per_hz};
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

double hann_offset_bins(double newton_step_bins) noexcept {
    constexpr double small = 1e-3, most = 0.5;
    constexpr int halvings = 50;
    const auto step_from = [](double x) { // of the power at x off the peak
        const auto power = [](double bins) { return std::pow(hann_response(bins), 2); };
        const double below = power(x - small), here = power(x), above = power(x + small);
        return -0.5 * small * (above - below) / (above - 2.0 * here + below);
    };
    double low = 0.0, high = most; // the step grows with the offset
    for (int k = 0; k < halvings; ++k) {
        const double middle = 0.5 * (low + high);
        (std::abs(step_from(middle)) < std::abs(newton_step_bins) ? low : high) = middle;
    }
    return std::copysign(low, newton_step_bins);
}

double hann_leakage_bound(double bins) noexcept {
    const double x = std::abs(bins);
    return x < 2.0 ? std::max(std::abs(hann_response(x)), 0.03) : 1.0 / (pi * x * (x * x - 1.0));
}

} // namespace tonewalk
