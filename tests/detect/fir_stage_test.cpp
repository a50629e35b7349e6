// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/detect/fir_stage.hpp"

#include <gtest/gtest.h>

#include "detect/signals.hpp"
#include "tonewalk/detect/narrow_low_pass.hpp"
#include "tonewalk/maths/fir.hpp"

namespace tonewalk {
namespace {

using namespace test;

fir_stage<float>::config stage_design(std::size_t up, std::size_t down) {
    const double dense_hz = 1000.0 * static_cast<double>(up);
    const double edge_hz = 500.0 / static_cast<double>(down);
    return {.taps = design_low_pass(
                {.rate_hz = dense_hz, .pass_edge_hz = 0.6 * edge_hz, .stop_edge_hz = edge_hz}),
            .up = up,
            .down = down};
}

std::vector<float> run(fir_stage<float>& stage, std::span<const float> in, std::uint64_t seed = 0) {
    std::vector<float> out;
    stage.begin();
    if (seed == 0) {
        stage.add(in, out);
    } else {
        in_pieces(in, seed, [&](std::span<const float> piece) { stage.add(piece, out); });
    }
    stage.end(out);
    return out;
}

TEST(FirStage, PutsEveryOutputWhereItBelongsAtAnyRatio) {
    for (const auto& [up, down] : {std::pair{1U, 1U}, {3U, 1U}, {1U, 4U}, {5U, 3U}}) {
        fir_stage<float> stage{stage_design(up, down)};
        const std::vector<float> in = real_tone(2000, 1000.0, 61.0, 0.7);
        const std::vector<float> out = run(stage, in);
        ASSERT_EQ(out.size(), (2000 * up + down - 1) / down);
        const double rate_hz = 1000.0 * up / down;
        for (std::size_t j = out.size() / 4; j < 3 * out.size() / 4; ++j) {
            const double truth = 0.7 * std::cos(turn * 61.0 * static_cast<double>(j) / rate_hz);
            ASSERT_NEAR(static_cast<double>(out[j]), truth, 2e-5) << up << '/' << down << " " << j;
        }
    }
}

TEST(FirStage, KeepsASteadyLevelUpToBothEdges) {
    fir_stage<float> stage{stage_design(2, 3)};
    for (const std::size_t size : {1U, 2U, 7U, 40U, 1000U}) {
        const std::vector<float> out = run(stage, std::vector<float>(size, 0.25F));
        ASSERT_EQ(out.size(), (2 * size + 2) / 3);
        for (const float sample : out) {
            EXPECT_NEAR(static_cast<double>(sample), 0.25, 0.25e-4); // two rows, 90 dB apart
        }
    }
}

TEST(FirStage, GivesTheSameBitsHoweverTheInputIsCut) {
    fir_stage<float> stage{stage_design(4, 3)};
    std::vector<float> in = real_tone(20000, 1000.0, 61.0, 0.7);
    const std::vector<float> whole = run(stage, in);
    for (const std::uint64_t seed : {1U, 2U, 3U}) {
        EXPECT_EQ(run(stage, in, seed), whole);
    }
}

TEST(NarrowLowPass, PassesTheSlowPartUndelayedAndStopsTheRest) {
    narrow_low_pass<float> filter{{.rate_hz = 50000.0, .pass_edge_hz = 25.0, .stop_edge_hz = 50.0}};
    std::vector<float> in = real_tone(100001, 50000.0, 10.0, 0.5), out;
    const std::vector<float> fast = real_tone(in.size(), 50000.0, 55.0, 0.5);
    for (std::size_t n = 0; n < in.size(); ++n) {
        in[n] += 1.0F + fast[n];
    }
    filter.begin();
    in_pieces<float>(in, 9, [&](std::span<const float> piece) { filter.add(piece, out); });
    filter.end(out);
    ASSERT_EQ(out.size(), in.size());
    for (std::size_t n = 20000; n < 80000; ++n) {
        const double truth = 1.0 + 0.5 * std::cos(turn * 10.0 * static_cast<double>(n) / 50000.0);
        ASSERT_NEAR(static_cast<double>(out[n]), truth, 2e-5) << n; // 100 dB, and two ripples
    }
}

} // namespace
} // namespace tonewalk
