// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/maths/fir.hpp"

#include <algorithm>
#include <cmath>
#include <numeric>

#include <gtest/gtest.h>

#include "support/expect_error.hpp"
#include "tonewalk/base/decibel.hpp"

namespace tonewalk {
namespace {

double largest_response(const std::vector<double>& taps, double rate_hz, double from_hz,
                        double to_hz, double less) {
    constexpr int points = 1500;
    double largest = 0.0;
    for (int k = 0; k <= points; ++k) {
        const double hz = from_hz + (to_hz - from_hz) * k / points;
        largest = std::max(largest, std::abs(symmetric_response(taps, rate_hz, hz) - less));
    }
    return largest;
}

void expect_kept(const low_pass_design& d) {
    const std::vector<double> taps = design_low_pass(d);
    const double stop = largest_response(taps, d.rate_hz, d.stop_edge_hz, d.rate_hz / 2.0, 0.0);
    const double ripple = largest_response(taps, d.rate_hz, 0.0, d.pass_edge_hz, 1.0);
    EXPECT_LE(decibel::from_amplitude_ratio(stop).db(), -d.attenuation_db) << taps.size();
    EXPECT_LE(decibel::from_amplitude_ratio(1.0 + ripple).db(), 0.001) << taps.size();
}

} // namespace

TEST(LowPass, StopsAndPassesAsAskedAtEverySize) {
    for (const double attenuation_db : {80.0, 90.0, 100.0, 120.0}) {
        for (const double transition : {0.3, 0.1, 0.03, 0.004}) {
            expect_kept({.rate_hz = 1.0,
                         .pass_edge_hz = 0.15,
                         .stop_edge_hz = 0.15 + transition,
                         .attenuation_db = attenuation_db});
        }
    }
}

TEST(LowPass, StaysCleanAtTenThousandTaps) {
    const low_pass_design d{.rate_hz = 48e3, .pass_edge_hz = 100.0, .stop_edge_hz = 131.0};
    EXPECT_GT(design_low_pass(d).size(), 10000U);
    expect_kept(d);
}

TEST(LowPass, ReachesUpToHalfTheRate) {
    expect_kept({.rate_hz = 48e3, .pass_edge_hz = 20e3, .stop_edge_hz = 24e3});
    expect_kept({.rate_hz = 48e3, .pass_edge_hz = 0.0, .stop_edge_hz = 2e3});
}

TEST(LowPass, IsSymmetricOddAndOfUnitSum) {
    const std::vector<double> taps =
        design_low_pass({.rate_hz = 1.0, .pass_edge_hz = 0.1, .stop_edge_hz = 0.13});
    EXPECT_EQ(taps.size() % 2, 1U);
    EXPECT_TRUE(std::equal(taps.begin(), taps.end(), taps.rbegin()));
    EXPECT_NEAR(std::accumulate(taps.begin(), taps.end(), 0.0), 1.0, 1e-14);
}

TEST(LowPass, ItsHalfIsAMultipleOfWhatIsAsked) {
    for (const std::size_t multiple : {1U, 7U, 32U, 100U}) {
        const std::vector<double> taps = design_low_pass({.rate_hz = 1.0,
                                                          .pass_edge_hz = 0.1,
                                                          .stop_edge_hz = 0.15,
                                                          .half_multiple_of = multiple});
        EXPECT_EQ(taps.size() / 2 % multiple, 0U);
    }
}

TEST(LowPass, RefusesEdgesOutOfOrder) {
    const auto refused = [](double pass_hz, double stop_hz) {
        const auto failure = test::caught([&] {
            static_cast<void>(design_low_pass(
                {.rate_hz = 1.0, .pass_edge_hz = pass_hz, .stop_edge_hz = stop_hz}));
        });
        return failure.kind == fault::bad_request;
    };
    EXPECT_TRUE(refused(0.2, 0.2));
    EXPECT_TRUE(refused(0.3, 0.2));
    EXPECT_TRUE(refused(0.1, 0.51));
    EXPECT_TRUE(refused(-0.1, 0.2));
    EXPECT_FALSE(refused(0.1, 0.5));
}

// Closed form: five equal taps respond as sin(5 x) / (5 sin x), x = pi f / rate.
TEST(SymmetricResponse, FollowsTheClosedFormOfEqualTaps) {
    const std::vector<double> taps(5, 0.2);
    for (const double hz : {1.0, 10.0, 100.0, 333.3, 499.0}) {
        const double x = 3.14159265358979323846 * hz / 1000.0;
        EXPECT_NEAR(symmetric_response(taps, 1000.0, hz), std::sin(5.0 * x) / (5.0 * std::sin(x)),
                    1e-14);
    }
}

} // namespace tonewalk
