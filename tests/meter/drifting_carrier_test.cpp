// SPDX-License-Identifier: GPL-3.0-or-later
#include <cmath>

#include <gtest/gtest.h>

#include "support/am_source.hpp"
#include "tonewalk/base/allowed_errors.hpp"

namespace tonewalk {
namespace {

using test::am_signal;
using test::measure;

double drifting(double t) { // 5 Hz a minute, in turns
    return 0.5 * 5.0 / 60.0 * t * t;
}

am_signal clean(std::uint64_t seed) {
    random_stream random{seed};
    am_signal s;
    s.rate_hz = random.uniform(5.5e3, 6.5e3);
    s.tone_hz = random.uniform(400.0, 700.0);
    s.depth = random.uniform(0.2, 0.8);
    s.offset_hz = random.uniform(-0.3, 0.3);
    s.phase = random.uniform(0.0, 6.28);
    return s;
}

/// Noise for this line SNR.
void add_noise(am_signal& s, double snr_db, double window_s) {
    s.noise_density = std::pow(10.0, (s.carrier_dbfs - snr_db) / 10.0) * window_s / 1.5;
}

// 0.33 Hz of drift inside each window: read as if it stood still, the level would fall by 0.3 dB.
TEST(DriftingCarrier, KeepsItsLevelInWindowsOfFourSeconds) {
    am_signal s = clean(11);
    s.cycles = drifting;
    const level_log log = measure(s, 70.0, {.every_s = 2.0, .window_s = 4.0});
    const double tone_dbfs = s.carrier_dbfs + 20.0 * std::log10(s.depth);
    ASSERT_GT(log.records.size(), 30U);
    for (const level_record& r : log.records) {
        EXPECT_NEAR(r.carrier_dbfs.value, s.carrier_dbfs, allowed("level_db.clean")) << r.time_s;
        EXPECT_NEAR(r.tone_dbfs.value, tone_dbfs, allowed("level_db.clean")) << r.time_s;
    }
}

/// Share of records from `from_s` on whose interval holds the truth that `level_db` adds.
double held_percent(const am_signal& s, const level_log& log, double from_s, double until_s) {
    double held = 0.0, n = 0.0;
    for (const level_record& r : log.records) {
        if (r.time_s < from_s || r.time_s >= until_s) {
            continue;
        }
        const double truth = s.carrier_dbfs + 20.0 * std::log10(std::abs(s.field(r.time_s)));
        n += 1.0;
        held += !(truth < r.carrier_dbfs.low95) && truth <= r.carrier_dbfs.high95 ? 1.0 : 0.0;
    }
    return 100.0 * held / n;
}

TEST(DriftingCarrier, IsFoundAgainAfterFifteenSecondsBelowTheNoise) {
    for (const double away_from_s : {0.0, 20.0}) {
        am_signal s = clean(21);
        s.cycles = drifting;
        s.field = [away_from_s](double t) {
            return t >= away_from_s && t < away_from_s + 15.0 ? 0.01 : 1.0;
        };
        add_noise(s, 35.0, 0.2);
        const level_log log = measure(s, 60.0, {});
        EXPECT_GT(held_percent(s, log, away_from_s + 15.2, 60.0), 92.0) << away_from_s;
        EXPECT_GT(held_percent(s, log, away_from_s, away_from_s + 14.9), 92.0) << away_from_s;
    }
}

TEST(DriftingCarrier, IsFoundAgainAfterTwoMinutes) {
    am_signal s = clean(22);
    s.cycles = drifting; // 10 Hz further: two lines of a 0.2 s window
    s.field = [](double t) { return t >= 10.0 && t < 130.0 ? 0.001 : 1.0; };
    add_noise(s, 35.0, 0.2);
    const level_log log = measure(s, 160.0, {});
    EXPECT_GT(held_percent(s, log, 131.0, 160.0), 92.0);
    EXPECT_NEAR(log.records.back().carrier_offset_hz,
                s.offset_hz + 5.0 / 60.0 * log.records.back().time_s, 0.05);
}

TEST(DriftingCarrier, NeverAsStrongAsTwentyDecibelsKeepsTheOpeningsFrequency) {
    am_signal s = clean(23);
    s.offset_hz = 0.1; // the opening was that much off
    s.field = [](double) { return 1.0; };
    add_noise(s, 12.0, 0.2);
    const level_log log = measure(s, 100.0, {});
    EXPECT_GT(held_percent(s, log, 0.0, 100.0), 93.0);
    EXPECT_EQ(log.records.front().carrier_offset_hz, 0.0);
}

} // namespace
} // namespace tonewalk
