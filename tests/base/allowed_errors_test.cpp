// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/base/allowed_errors.hpp"

#include <cmath>
#include <set>

namespace {

using namespace tonewalk;

TEST(AllowedErrors, HoldEachKeyOnceWithWordsAndAFiniteFigure) {
    std::set<std::string_view> keys;
    for (const allowed_error& row : allowed_errors()) {
        EXPECT_TRUE(keys.insert(row.key).second) << row.key;
        EXPECT_FALSE(row.quantity.empty() || row.conditions.empty() || row.unit.empty()) << row.key;
        EXPECT_TRUE(std::isfinite(row.allowed)) << row.key;
        EXPECT_EQ(allowed(row.key), row.allowed);
    }
    EXPECT_GE(keys.size(), 40U);
}

TEST(AllowedErrors, KeepTheGoalsThatTestsLeanOn) {
    EXPECT_EQ(allowed("level_db.clean"), 0.002);
    EXPECT_EQ(allowed("tone_mean_db.cn_minus3"), 0.1);
    EXPECT_EQ(allowed("null_bias_db"), 0.5);
    EXPECT_EQ(allowed("coverage_percent.floor_high"), 98.5);
}

} // namespace
