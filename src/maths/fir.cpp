// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/maths/fir.hpp"

#include <algorithm>
#include <cmath>
#include <numbers>

#include <fmt/core.h>

#include "tonewalk/base/decibel.hpp"
#include "tonewalk/base/error.hpp"

namespace tonewalk {
namespace {

/// Kaiser's shape factor for a stop band `attenuation_db` down (J. F. Kaiser, "Nonrecursive Digital
/// Filter Design Using the I0-sinh Window Function", Proc. IEEE ISCAS 1974; from memory).
double kaiser_beta(double attenuation_db) {
    if (attenuation_db > 50.0) {
        return 0.1102 * (attenuation_db - 8.7);
    }
    if (attenuation_db > 21.0) {
        return 0.5842 * std::pow(attenuation_db - 21.0, 0.4) + 0.07886 * (attenuation_db - 21.0);
    }
    return 0.0;
}

double sinc(double x) {
    const double turn = std::numbers::pi * x;
    return x == 0.0 ? 1.0 : std::sin(turn) / turn;
}

void check(const low_pass_design& d) {
    const bool good = d.rate_hz > 0.0 && d.pass_edge_hz >= 0.0 && d.pass_edge_hz < d.stop_edge_hz &&
                      d.stop_edge_hz <= d.rate_hz / 2.0 && d.attenuation_db > 0.0 &&
                      d.half_multiple_of > 0;
    if (!good) {
        throw error{fault::bad_request,
                    fmt::format("pass edge {} Hz, stop edge {} Hz, rate {} Hz are out of order",
                                d.pass_edge_hz, d.stop_edge_hz, d.rate_hz),
                    "low-pass design", "give 0 <= pass edge < stop edge <= rate/2"};
    }
}

/// 2 half + 1 taps of sum 1.
std::vector<double> kaiser_low_pass(std::size_t half, double cutoff, double beta) {
    std::vector<double> taps(2 * half + 1);
    double sum = 0.0;
    for (std::size_t k = 0; k <= half; ++k) {
        const double x = static_cast<double>(k), r = x / static_cast<double>(half);
        const double tap = cutoff * sinc(cutoff * x) *
                           std::cyl_bessel_i(0.0, beta * std::sqrt(std::max(0.0, 1.0 - r * r)));
        taps[half - k] = taps[half + k] = tap;
        sum += k == 0 ? tap : 2.0 * tap;
    }
    for (double& tap : taps) {
        tap /= sum;
    }
    return taps;
}

/// Whether the whole stop band is down as asked.
bool stops(const std::vector<double>& taps, const low_pass_design& d) {
    constexpr int points = 512;
    const double most = decibel::from_db(-d.attenuation_db).amplitude_ratio();
    const double step_hz = (d.rate_hz / 2.0 - d.stop_edge_hz) / points;
    for (int k = 0; k <= points; ++k) {
        if (std::abs(symmetric_response(taps, d.rate_hz, d.stop_edge_hz + k * step_hz)) > most) {
            return false;
        }
    }
    return true;
}

} // namespace

std::vector<double> design_low_pass(const low_pass_design& d) {
    check(d);
    constexpr double margin_db = 3.0;      // Kaiser's length estimate misses by some tenths
    constexpr std::size_t short_half = 32; // and by more where there are few taps
    const double attenuation_db = d.attenuation_db + margin_db;
    const double width = 2.0 * std::numbers::pi * (d.stop_edge_hz - d.pass_edge_hz) / d.rate_hz;
    const double half_wanted = std::max(1.0, (attenuation_db - 7.95) / (2.285 * width) / 2.0);
    const double multiple = static_cast<double>(d.half_multiple_of);
    auto half = static_cast<std::size_t>(std::ceil(half_wanted / multiple) * multiple);

    const double cutoff = (d.pass_edge_hz + d.stop_edge_hz) / d.rate_hz; // of half the rate
    const double beta = kaiser_beta(attenuation_db);
    std::vector<double> taps = kaiser_low_pass(half, cutoff, beta);
    while (half < short_half && !stops(taps, d)) {
        half += d.half_multiple_of;
        taps = kaiser_low_pass(half, cutoff, beta);
    }
    return taps;
}

double symmetric_response(std::span<const double> taps, double rate_hz, double hz) noexcept {
    const std::size_t half = taps.size() / 2;
    double sum = taps[half];
    for (std::size_t k = 1; k <= half; ++k) {
        sum += 2.0 * taps[half + k] *
               std::cos(2.0 * std::numbers::pi * hz / rate_hz * static_cast<double>(k));
    }
    return sum;
}

} // namespace tonewalk
