// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cmath>
#include <complex>
#include <numbers>
#include <span>
#include <vector>

#include "tonewalk/base/sample.hpp"

/// Two meters that look right and are wrong, kept as twins of the real one: tests show that each
/// exceeds the allowed error where ours holds it.
namespace tonewalk::test {

/// Mean of a Hann-windowed record times a line at `hz`; phase counted from the record's centre.
inline cf64 hann_line(std::span<const cf32> record, double rate_hz, double hz) {
    const double centre = static_cast<double>(record.size()) / 2.0;
    cf64 sum{};
    for (std::size_t n = 0; n < record.size(); ++n) {
        const double hann = 1.0 - std::cos(std::numbers::pi * static_cast<double>(n) / centre);
        const double t = (static_cast<double>(n) - centre) / rate_hz;
        sum += hann * cf64{record[n]} * std::polar(1.0, -2.0 * std::numbers::pi * hz * t);
    }
    return sum / static_cast<double>(record.size());
}

struct twin_grid {
    double rate_hz = 0.0, tone_hz = 0.0;
    std::size_t window = 0, every = 0;
};

/// Wrong: carries the carrier's phase from record to record (a slow average of neighbours) and
/// takes the tone in phase with it. At a partial null the field stands 90 degrees from its
/// neighbours.
inline std::vector<double> tone_power_with_carried_phase(std::span<const cf32> samples,
                                                         const twin_grid& g) {
    std::vector<cf64> carrier, upper, lower;
    for (std::size_t first = 0; first + g.window <= samples.size(); first += g.every) {
        const auto record = samples.subspan(first, g.window);
        carrier.push_back(hann_line(record, g.rate_hz, 0.0));
        upper.push_back(hann_line(record, g.rate_hz, g.tone_hz));
        lower.push_back(hann_line(record, g.rate_hz, -g.tone_hz));
    }
    constexpr std::size_t reach = 20;
    std::vector<double> power;
    for (std::size_t k = 0; k < carrier.size(); ++k) {
        cf64 sum{};
        for (std::size_t m = k > reach ? k - reach : 0; m < std::min(k + reach + 1, carrier.size());
             ++m) {
            sum += carrier[m] * std::abs(carrier[m]); // strong neighbours lead
        }
        const cf64 c = sum / std::abs(sum);
        power.push_back(
            std::norm((upper[k] * std::conj(c)).real() + (lower[k] * std::conj(c)).real()));
    }
    return power;
}

/// Wrong: tunes each record to its own highest line. In a null the field turns quickly, which
/// passes for another frequency and fills the null.
inline std::vector<double> carrier_power_retuned(std::span<const cf32> samples,
                                                 const twin_grid& g) {
    std::vector<double> power;
    const double bin_hz = g.rate_hz / static_cast<double>(g.window);
    for (std::size_t first = 0; first + g.window <= samples.size(); first += g.every) {
        const auto record = samples.subspan(first, g.window);
        double best = 0.0;
        for (double hz = -bin_hz; hz <= bin_hz; hz += bin_hz / 16.0) {
            best = std::max(best, std::norm(hann_line(record, g.rate_hz, hz)));
        }
        power.push_back(best);
    }
    return power;
}

} // namespace tonewalk::test
