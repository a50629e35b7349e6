// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <algorithm>
#include <cstddef>
#include <span>
#include <vector>

#include <gtest/gtest.h>

#include "tonewalk/channel/chain.hpp"

namespace tonewalk::test {

struct recorded_stretch {
    baseband_stretch about;
    std::vector<cf32> iq;
    std::vector<bool> touched; ///< by non-finite input, a flag a sample
    bool ended = false;
};

/// Keeps all that a chain hands to its sinks, and holds it to the order that they may rely on.
class baseband_recorder final : public baseband_sink {
public:
    std::vector<recorded_stretch> stretches;
    std::size_t longest_run = 0;
    bool finished = false;

    void begin_stretch(const baseband_stretch& about) override {
        EXPECT_TRUE(stretches.empty() || stretches.back().ended);
        stretches.emplace_back().about = about;
    }
    void add(const baseband_block& block) override {
        recorded_stretch& now = stretches.back();
        EXPECT_FALSE(now.ended);
        EXPECT_EQ(block.first, static_cast<sample_index>(now.iq.size()));
        now.iq.insert(now.iq.end(), block.iq.begin(), block.iq.end());
        longest_run = std::max(longest_run, block.iq.size());
        for (std::size_t k = 0; k < block.iq.size(); ++k) {
            const sample_index n = block.first + static_cast<sample_index>(k);
            now.touched.push_back(std::any_of(
                block.non_finite.begin(), block.non_finite.end(),
                [n](const sample_range& r) { return n >= r.first && n < r.first + r.count; }));
        }
        for (std::size_t k = 1; k < block.non_finite.size(); ++k) {
            const sample_range& before = block.non_finite[k - 1];
            EXPECT_GT(block.non_finite[k].first, before.first + before.count); // sorted, merged
        }
    }
    void end_stretch() override {
        EXPECT_FALSE(stretches.back().ended);
        stretches.back().ended = true;
    }
    void finish() override {
        EXPECT_FALSE(finished);
        EXPECT_TRUE(stretches.empty() || stretches.back().ended);
        finished = true;
    }
};

/// The same samples, bit by bit.
inline bool same_bits(const std::vector<cf32>& a, const std::vector<cf32>& b) {
    const auto of_a = std::as_bytes(std::span{a}), of_b = std::as_bytes(std::span{b});
    return std::equal(of_a.begin(), of_a.end(), of_b.begin(), of_b.end());
}

} // namespace tonewalk::test
