// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/meter/reference_drift.hpp"

#include <cmath>

#include <gtest/gtest.h>

#include "support/am_source.hpp"
#include "support/expect_error.hpp"
#include "tonewalk/base/allowed_errors.hpp"

namespace tonewalk {
namespace {

using test::am_signal;

constexpr std::array<reference_span, 2> spans{{{0.0, 5.0}, {35.0, 40.0}}};

/// A steady transmitter whose level runs away by `drift_db` from 2.5 s to 37.5 s.
am_signal drifting(double drift_db, double line_snr_db = 60.0) {
    am_signal s;
    s.rate_hz = 8e3;
    s.tone_hz = 503.3;
    s.depth = 0.5;
    s.noise_density = std::pow(10.0, (s.carrier_dbfs - line_snr_db) / 10.0) * 0.2 / 1.5;
    s.field = [drift_db](double t) {
        return std::complex<double>{std::pow(10.0, drift_db * (t - 2.5) / 35.0 / 20.0), 0.0};
    };
    return s;
}

TEST(ReferenceDrift, IsFoundAndTakenOffEveryLevel) {
    level_log log = test::measure(drifting(1.4), 40.0, {});
    const level_log before = log;
    const reference_drift d = remove_drift(log, spans);
    EXPECT_NEAR(d.drift_db.value, 1.4, 0.01);
    EXPECT_NEAR(d.level_dbfs[0].value, -20.0, 0.01);
    EXPECT_NEAR(d.level_dbfs[1].value, -18.6, 0.01);
    const double tone_dbfs = -20.0 + 20.0 * std::log10(0.5);
    for (std::size_t k = 25; k + 25 < log.records.size(); ++k) { // between the middles
        const level_record &r = log.records[k], &was = before.records[k];
        EXPECT_NEAR(r.carrier_dbfs.value, -20.0, 0.03);
        EXPECT_NEAR(r.tone_dbfs.value, tone_dbfs, 0.1);
        EXPECT_NEAR(10.0 * std::log10(r.carrier.power), r.carrier_dbfs.value, 1e-9);
        EXPECT_EQ(r.depth_percent.value, was.depth_percent.value);
    }
}

TEST(ReferenceDrift, HalfOfItJoinsEveryInterval) {
    level_log log = test::measure(drifting(1.4), 40.0, {});
    const level_log before = log;
    const reference_drift d = remove_drift(log, spans);
    const double half = std::hypot(0.5 * d.drift_db.value, d.drift_db.u95);
    EXPECT_NEAR(half, 0.7, 0.02);
    EXPECT_EQ(log.common_u95_db, half);
    for (std::size_t k = 0; k < log.records.size(); ++k) {
        const interval_estimate &is = log.records[k].carrier_dbfs,
                                &was = before.records[k].carrier_dbfs;
        EXPECT_NEAR(is.u95, std::hypot(was.u95, half), 1e-12);
        EXPECT_NEAR(is.value - is.low95, std::hypot(was.value - was.low95, half), 1e-9);
        EXPECT_NEAR(is.high95 - is.value, std::hypot(was.high95 - was.value, half), 1e-9);
    }
}

TEST(ReferenceDrift, WithoutDriftOnlyNoiseJoins) {
    level_log log = test::measure(drifting(0.0), 40.0, {});
    const reference_drift d = remove_drift(log, spans);
    EXPECT_LT(std::abs(d.drift_db.value), 2.0 * d.drift_db.u95);
    EXPECT_LT(log.common_u95_db, 0.01);
}

// The level at a reference is a mean over 39 records that overlap by half.
TEST(CoverageReferenceDrift, TheDriftsIntervalHoldsTheTruth) {
    constexpr int seeds = 1000;
    int held = 0;
    for (int seed = 1; seed <= seeds; ++seed) {
        am_signal s = drifting(0.0, 25.0);
        s.rate_hz = 1e3;
        s.tone_hz = 103.3;
        s.seed = static_cast<std::uint64_t>(seed);
        level_log log = test::measure(s, 8.4, {});
        const reference_drift d = remove_drift(log, {{{0.0, 4.1}, {4.2, 8.4}}});
        held += std::abs(d.drift_db.value) <= d.drift_db.u95 ? 1 : 0;
    }
    EXPECT_GE(held, seeds / 100.0 * allowed("coverage_percent.low"));
    EXPECT_LE(held, seeds / 100.0 * allowed("coverage_percent.high"));
}

TEST(ReferenceDrift, WantsRecordsThatShowTheCarrier) {
    level_log log = test::measure(drifting(0.0), 40.0, {});
    for (const std::array<reference_span, 2>& wrong :
         {std::array<reference_span, 2>{{{0.0, 0.1}, {35.0, 40.0}}},
          std::array<reference_span, 2>{{{0.0, 5.0}, {50.0, 60.0}}}}) {
        const auto refusal = test::caught([&] { remove_drift(log, wrong); });
        EXPECT_EQ(refusal.kind, fault::malformed);
        EXPECT_TRUE(refusal.says("--reference"));
    }
}

} // namespace
} // namespace tonewalk
