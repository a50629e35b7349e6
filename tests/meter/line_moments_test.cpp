// SPDX-License-Identifier: GPL-3.0-or-later
#include "../../src/meter/line_moments.hpp"

#include <cmath>
#include <numbers>

#include <gtest/gtest.h>

#include "tonewalk/base/random.hpp"
#include "tonewalk/maths/window.hpp"

namespace tonewalk {
namespace {

constexpr double two_pi = 2.0 * std::numbers::pi;

struct weighted_record {
    std::vector<cf32> samples;
    std::vector<double> weights;
    double rate_hz;
    [[nodiscard]] sample_runs runs() const {
        sample_runs r{samples.size()};
        r.set(samples, weights);
        return r;
    }
    /// The correlation from its definition, sample by sample.
    [[nodiscard]] cf64 correlation(double hz) const {
        const double half = static_cast<double>(samples.size()) / 2.0;
        cf64 sum{};
        for (std::size_t n = 0; n < samples.size(); ++n) {
            const double t = (static_cast<double>(n) - half) / rate_hz;
            sum += weights[n] * cf64{samples[n]} * std::polar(1.0, -two_pi * hz * t);
        }
        return sum;
    }
};

weighted_record noise_and_line(std::size_t size, double rate_hz, double line_hz,
                               std::uint64_t seed) {
    weighted_record r{{}, {}, rate_hz};
    random_stream random{seed};
    const double phase = random.uniform(0.0, two_pi);
    const window hann = hann_window(size);
    for (std::size_t n = 0; n < size; ++n) {
        const double t = static_cast<double>(n) / rate_hz;
        const cf64 z = std::polar(0.4, two_pi * line_hz * t + phase) +
                       0.1 * cf64{random.gaussian(), random.gaussian()};
        r.samples.push_back(cf32{z});
        r.weights.push_back(hann.values()[n] / hann.coherent_gain() / static_cast<double>(size));
    }
    return r;
}

TEST(LineMoments, EqualTheCorrelationFromItsDefinitionWithinTheirReach) {
    for (const std::size_t size : {std::size_t{33}, std::size_t{1000}, std::size_t{4811}}) {
        const double rate_hz = 24e3, window_s = static_cast<double>(size) / rate_hz;
        const double f0_hz = 1234.5, reach_hz = std::min(2.0, 1.0 / window_s);
        const weighted_record r = noise_and_line(size, rate_hz, f0_hz + 0.3, size);
        const line_moments moments{r.runs(), rate_hz, f0_hz,
                                   orders_reaching(reach_hz, window_s, rate_hz)};
        for (const double delta_hz : {-reach_hz, -0.31 * reach_hz, 0.0, 0.77 * reach_hz}) {
            EXPECT_LT(std::abs(moments.at(f0_hz + delta_hz) - r.correlation(f0_hz + delta_hz)),
                      1e-9)
                << size << " samples, " << delta_hz << " Hz off";
        }
    }
}

TEST(LineMoments, DeriveByFrequencyLikeDifferencesOfTheCorrelation) {
    const weighted_record r = noise_and_line(4800, 24e3, 7.7, 5);
    const line_moments moments{r.runs(), 24e3, 7.2, orders_reaching(2.0, 0.2, 24e3)};
    const double hz = 7.9, step_hz = 1e-3;
    const cf64 before = r.correlation(hz - step_hz), at = r.correlation(hz),
               after = r.correlation(hz + step_hz);
    const line_moments::series x = moments.derivatives(hz);
    EXPECT_LT(std::abs(x.value - at), 1e-9);
    EXPECT_LT(std::abs(x.first - (after - before) / (2.0 * step_hz)), 1e-6);
    EXPECT_LT(std::abs(x.second - (after - 2.0 * at + before) / (step_hz * step_hz)), 1e-5);
}

TEST(HannResponse, IsTheWindowsOwnSumAndStaysBelowItsBound) {
    const window hann = hann_window(4096);
    for (double bins = 0.0; bins < 12.0; bins += 0.173) {
        EXPECT_NEAR(hann_response(bins), hann.response(bins), 2e-6) << bins;
        EXPECT_LE(std::abs(hann_response(bins)), hann_leakage_bound(bins)) << bins;
    }
}

} // namespace
} // namespace tonewalk
