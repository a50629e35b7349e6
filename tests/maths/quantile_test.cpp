// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/maths/quantile.hpp"

#include <cmath>
#include <limits>

#include <gtest/gtest.h>

namespace tonewalk {

TEST(Quantile, IsLinearBetweenOrderStatistics) {
    const std::vector<double> values{40.0, 10.0, 30.0, 20.0};
    EXPECT_DOUBLE_EQ(quantile(values, 0.0), 10.0);
    EXPECT_DOUBLE_EQ(quantile(values, 1.0), 40.0);
    EXPECT_DOUBLE_EQ(quantile(values, 0.5), 25.0);
    EXPECT_DOUBLE_EQ(quantile(values, 0.1), 13.0);
    EXPECT_DOUBLE_EQ(median(values), 25.0);
    EXPECT_DOUBLE_EQ(median({3.0, 1.0, 2.0}), 2.0);
}

TEST(Quantile, OfOneValueIsThatValueAndOfNoneIsNotMeasured) {
    EXPECT_EQ(quantile({7.0}, 0.9), 7.0);
    EXPECT_TRUE(std::isnan(median({})));
}

// A record without a level counts as lowest: minus infinity must not make its neighbours NaN.
TEST(Quantile, BearsInfinitelyLowValues) {
    const double lowest = -std::numeric_limits<double>::infinity();
    const std::vector<double> sorted{lowest, lowest, -3.0, -2.0, -1.0};
    EXPECT_EQ(quantile_sorted(sorted, 0.0), lowest);
    EXPECT_EQ(quantile_sorted(sorted, 0.25), lowest);
    EXPECT_EQ(quantile_sorted(sorted, 0.5), -3.0);
    EXPECT_EQ(quantile_sorted(sorted, 0.1), lowest);
    EXPECT_EQ(quantile_sorted(sorted, 0.3), lowest);
}

} // namespace tonewalk
