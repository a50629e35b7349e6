// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/base/near_name.hpp"

#include <array>

namespace {

using namespace tonewalk;

constexpr std::array<std::string_view, 4> jobs{"look", "hear", "levels", "depth"};

TEST(NearName, FindsTheNameWithTheFewestSlips) {
    EXPECT_EQ(near_name("level", jobs), "levels");
    EXPECT_EQ(near_name("Detph", jobs), "depth"); // two letters exchanged count once
    EXPECT_EQ(near_name("hera", jobs), "hear");
    EXPECT_EQ(near_name("lok", jobs), "look");
}

TEST(NearName, SaysNothingWhereNoneIsNear) {
    EXPECT_EQ(near_name("sums", jobs), "");
    EXPECT_EQ(near_name("", jobs), "");
    EXPECT_EQ(name_hint("sums", jobs), "known are: look, hear, levels, depth");
    EXPECT_EQ(name_hint("leevls", jobs), "did you mean levels?");
}

} // namespace
