// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/meter/record_grid.hpp"

#include <gtest/gtest.h>

namespace tonewalk {
namespace {

TEST(RecordGrid, StartsAtTheFirstSampleWhereTheFilterIsShort) {
    const record_grid grid{
        .rate_hz = 8000.0, .every_s = 0.1, .window_s = 0.2, .settle_samples = 16};
    EXPECT_EQ(grid.window_samples(), 1600);
    EXPECT_EQ(grid.skip_samples(), 0); // exactly 1 %
    EXPECT_EQ(grid.first(0), 0);
    EXPECT_EQ(grid.first(3), 2400);
    EXPECT_DOUBLE_EQ(grid.centre_s(0), 0.1);
    EXPECT_EQ(grid.records(1599), 0);
    EXPECT_EQ(grid.records(1600), 1);
    EXPECT_EQ(grid.records(2399), 1);
    EXPECT_EQ(grid.records(2400), 2);
}

TEST(RecordGrid, SkipsHalfALongFilterAtBothEnds) {
    const record_grid grid{
        .rate_hz = 8000.0, .every_s = 0.1, .window_s = 0.2, .settle_samples = 17};
    EXPECT_EQ(grid.first(0), 17);
    EXPECT_EQ(grid.first(1), 817);
    EXPECT_EQ(grid.records(1600 + 33), 0);
    EXPECT_EQ(grid.records(1600 + 34), 1);
}

TEST(RecordGrid, CountsExactlyThoseThatTheStretchHolds) {
    for (const double every_s : {0.1, 0.0333, 1.0 / 7.0, 0.25}) {
        const record_grid grid{
            .rate_hz = 81920.7, .every_s = every_s, .window_s = 0.05, .settle_samples = 90};
        for (sample_index samples = 0; samples < 300000; samples += 997) {
            const sample_index n = grid.records(samples);
            EXPECT_FALSE(grid.holds(n, samples));
            EXPECT_TRUE(n == 0 || grid.holds(n - 1, samples));
        }
    }
}

TEST(RecordGrid, DoesNotDrift) {
    const record_grid grid{.rate_hz = 81920.7, .every_s = 0.1, .window_s = 0.2};
    EXPECT_EQ(grid.first(864000), 7077948480); // a day: 86400 s x 81920.7/s
}

} // namespace
} // namespace tonewalk
