// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/detect/sample_gaps.hpp"

#include <set>

#include <gtest/gtest.h>

#include "tonewalk/base/random.hpp"

namespace tonewalk {
namespace {

TEST(SampleGaps, AgreeWithASetOfSamples) {
    random_stream random{3};
    for (int round = 0; round < 50; ++round) {
        sample_gaps gaps;
        std::set<sample_index> truth;
        for (int i = 0; i < 12; ++i) {
            const sample_range range{static_cast<sample_index>(random.next() % 200),
                                     static_cast<sample_index>(random.next() % 12)};
            const auto spread = static_cast<sample_index>(random.next() % 3);
            gaps.add(std::span{&range, 1}, spread);
            for (sample_index n = range.first - spread;
                 range.count > 0 && n < range.first + range.count + spread; ++n) {
                truth.insert(n);
            }
        }
        for (sample_index n = -10; n < 230; ++n) {
            ASSERT_EQ(gaps.contains(n), truth.count(n) == 1) << round << ' ' << n;
            ASSERT_EQ(gaps.touches(n, 5), truth.lower_bound(n) != truth.lower_bound(n + 5)) << n;
        }
        for (std::size_t i = 1; i < gaps.ranges().size(); ++i) {
            const sample_range& before = gaps.ranges()[i - 1];
            EXPECT_LT(before.first + before.count, gaps.ranges()[i].first);
        }
    }
}

TEST(SampleGaps, ForgetWhatEndsBefore) {
    sample_gaps gaps;
    const std::vector<sample_range> ranges{{10, 5}, {20, 5}};
    gaps.add(ranges);
    gaps.forget_before(15);
    EXPECT_FALSE(gaps.contains(12));
    EXPECT_TRUE(gaps.contains(24));
    gaps.forget_before(24);
    EXPECT_TRUE(gaps.contains(24));
}

} // namespace
} // namespace tonewalk
