// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/meter/level_log.hpp"

#include <cmath>

#include <gtest/gtest.h>

namespace tonewalk {
namespace {

level_record detected(double carrier_dbfs, double tone_dbfs, double depth_percent) {
    level_record r;
    r.carrier_dbfs.value = carrier_dbfs;
    r.tone_dbfs.value = tone_dbfs;
    r.depth_percent.value = depth_percent;
    r.noise_power = 1e-9;
    return r;
}

level_record bounded(double high95) {
    level_record r;
    r.carrier_dbfs.high95 = r.tone_dbfs.high95 = high95;
    r.noise_power = 4e-9;
    return r;
}

level_log of(std::vector<level_record> records) {
    level_log log;
    log.window_s = 0.2;
    log.tone_hz = 1000.0;
    log.records = std::move(records);
    return log;
}

double number(const sheet& s, const char* key) {
    return std::get<double>(*s.find(key));
}

TEST(LevelLog, GivesMediansOfDetectedRecords) {
    const level_log log = of({detected(-20.0, -30.0, 30.0), detected(-22.0, -31.0, 32.0),
                              detected(-21.0, -36.0, 31.0), bounded(-70.0), level_record{}});
    const sheet s = describe(log);
    EXPECT_EQ(number(s, "carrier_median_dbfs"), -21.0);
    EXPECT_EQ(number(s, "tone_median_dbfs"), -31.0);
    EXPECT_EQ(number(s, "depth_median_percent"), 31.0);
    // Four records told the noise: the median of 1, 1, 1, 4, over 1.5 / 0.2 s.
    EXPECT_NEAR(number(s, "noise_median_dbfs_hz"), 10.0 * std::log10(1e-9 / 7.5), 1e-9);
}

TEST(LevelLog, GivesNullWhereNothingWasDetected) {
    const sheet s = describe(of({bounded(-70.0), level_record{}}));
    for (const char* key : {"carrier_median_dbfs", "tone_median_dbfs", "depth_median_percent"}) {
        EXPECT_TRUE(std::isnan(number(s, key))) << key;
    }
    EXPECT_TRUE(std::isnan(number(describe(of({level_record{}})), "noise_median_dbfs_hz")));
}

TEST(LevelLog, TellsFlagsInWords) {
    EXPECT_EQ(flag_words(0), "");
    EXPECT_EQ(flag_words(flag_weak_tone), "weak-tone");
    EXPECT_EQ(flag_words(flag_weak_carrier | flag_weak_tone | flag_envelope_suppressed),
              "weak-carrier weak-tone envelope-suppressed");
    EXPECT_EQ(flag_words(flag_non_finite), "non-finite-samples");
    EXPECT_EQ(flag_words(flag_not_held), "segments-skipped");
}

TEST(LevelSummary, InterpolatesBetweenOrderStatistics) {
    const level_summary s =
        summarise(of({detected(-3, 0, 1), detected(-1, 0, 1), detected(-2, 0, 1),
                      detected(-4, 0, 1), detected(-5, 0, 1), level_record{}}),
                  quantity::carrier);
    EXPECT_EQ(s.max_dbfs, -1.0);
    EXPECT_EQ(s.median_dbfs, -3.0);
    EXPECT_EQ(s.min_dbfs, -5.0);
    EXPECT_NEAR(s.p10_dbfs, -4.6, 1e-12);
    EXPECT_NEAR(s.p90_dbfs, -1.4, 1e-12);
    EXPECT_EQ(s.swing_db, 4.0);
    EXPECT_TRUE(std::isnan(s.swing_at_least));
    EXPECT_EQ(s.undetected, 0U);
}

TEST(LevelSummary, BoundsQuantilesThatFallOnUndetectedRecords) {
    const level_summary s = summarise(of({detected(-3, 0, 1), detected(-1, 0, 1),
                                          detected(-2, 0, 1), bounded(-40), bounded(-45)}),
                                      quantity::carrier);
    EXPECT_EQ(s.max_dbfs, -1.0);
    EXPECT_EQ(s.median_dbfs, -3.0);
    EXPECT_TRUE(std::isnan(s.min_dbfs));
    EXPECT_EQ(s.min_high95, -40.0);
    EXPECT_TRUE(std::isnan(s.p10_dbfs));
    EXPECT_EQ(s.p10_high95, -40.0);
    EXPECT_TRUE(std::isnan(s.swing_db));
    EXPECT_EQ(s.swing_at_least, 39.0);
    EXPECT_EQ(s.undetected, 2U);
}

} // namespace
} // namespace tonewalk
