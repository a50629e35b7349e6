// SPDX-License-Identifier: GPL-3.0-or-later
#include <cmath>
#include <numbers>

#include <gtest/gtest.h>

#include "support/am_source.hpp"
#include "tonewalk/base/allowed_errors.hpp"

namespace tonewalk {
namespace {

using test::am_signal;
using test::measure;

constexpr double two_pi = 2.0 * std::numbers::pi;

/// Turns of a carrier that drifts by `drift_hz_s` and swings by 0.5 Hz either
/// way once a minute.
std::function<double(double)> wandering(double drift_hz_s, double swing_hz) {
    constexpr double period_s = 60.0;
    return [=](double t) {
        const double swung = swing_hz * period_s / two_pi * (1.0 - std::cos(two_pi * t / period_s));
        return drift_hz_s * t * t / 2.0 + swung;
    };
}

void expect_clean(const am_signal& s, const test::meter_options& o, double seconds) {
    const level_log log = measure(s, seconds, o);
    const double tone_dbfs = s.carrier_dbfs + 20.0 * std::log10(s.depth);
    ASSERT_GT(log.records.size(), 50U);
    for (const level_record& r : log.records) {
        ASSERT_NEAR(r.carrier_dbfs.value, s.carrier_dbfs, allowed("level_db.clean")) << r.time_s;
        ASSERT_NEAR(r.tone_dbfs.value, tone_dbfs, allowed("level_db.clean")) << r.time_s;
    }
}

TEST(CleanLevelsUnderDrift, HoldWhileTheCarrierDriftsFiveHertzAMinute) {
    am_signal s;
    s.rate_hz = 12.3e3;
    s.tone_hz = 1017.0;
    for (const double sign : {1.0, -1.0}) {
        s.cycles = wandering(sign * 5.0 / 60.0, 0.0);
        expect_clean(s, {}, 40.0);
    }
}

TEST(CleanLevelsUnderDrift, HoldWhileTheCarrierSwingsHalfAHertzAMinute) {
    am_signal s;
    s.rate_hz = 12.3e3;
    s.tone_hz = 1017.0;
    s.cycles = wandering(0.0, 0.5);
    expect_clean(s, {}, 90.0);
}

TEST(CleanLevelsUnderDrift, HoldInWindowsOfASecond) {
    am_signal s;
    s.rate_hz = 12.3e3;
    s.tone_hz = 1017.0;
    s.cycles = wandering(5.0 / 60.0, 0.0);
    expect_clean(s, {.every_s = 0.5, .window_s = 1.0}, 40.0);
}

TEST(CleanLevelsUnderDrift, HoldWhereTheOpeningGaveTheToneFiveHundredthsOff) {
    am_signal s;
    s.rate_hz = 12.3e3;
    s.tone_hz = 1017.0;
    for (const double off_hz : {-0.05, 0.02, 0.05}) {
        for (const double window_s : {0.2, 1.0}) {
            test::meter_options o{.every_s = 0.1, .window_s = window_s};
            o.tone_hz = s.tone_hz + off_hz;
            expect_clean(s, o, 10.0);
        }
    }
}

TEST(CleanLevelsUnderDrift, TheCurveFollowsTheCarrier) {
    am_signal s;
    s.rate_hz = 12.3e3;
    s.cycles = wandering(0.0, 0.5);
    const level_log log = measure(s, 60.0, {});
    for (const level_record& r : log.records) {
        EXPECT_NEAR(r.carrier_offset_hz, 0.5 * std::sin(two_pi * r.time_s / 60.0), 0.05)
            << r.time_s;
    }
}

} // namespace
} // namespace tonewalk
