// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/channel/front_end.hpp"

#include <cmath>
#include <cstdint>
#include <limits>

#include <gtest/gtest.h>

#include "channel_support.hpp"
#include "support/expect_error.hpp"

namespace tonewalk::test {
namespace {

constexpr double float_accuracy =
    3e-7; // of full scale: input, taps and output are single precision

std::unique_ptr<const front_end> front_for(const stream_facts& facts, const channel_plan& plan) {
    return front_end::make(facts, std::span{&plan, 1});
}

/// One block that is a whole stretch, all its outputs.
std::vector<cf32> process(const front_end& front, const stream_facts& facts,
                          const std::vector<std::byte>& frames, sample_index first,
                          raw_counts* kept = nullptr) {
    raw_block block;
    block.bytes = frames;
    block.first = first;
    block.count = frames.size() / facts.frame_bytes();
    block.ends_stretch = true;
    std::vector<cf32> iq(front.outputs(block));
    const std::span<cf32> out{iq};
    raw_counts counts;
    counts.cells.reserve(block.count / front.cell() + 1);
    counts.non_finite.reserve(block.count / front.cell() + 1);
    front.process(block, *front.make_workspace(block.count), counts, std::span{&out, 1});
    if (kept != nullptr) {
        *kept = counts;
    }
    return iq;
}

TEST(FrontEnd, OutputRateIsEightToSixteenWidthsWhereDecimationBy64Allows) {
    for (const double rate_hz : {48e3, 250e3, 1.024e6, 2.4e6, 6.25e6, 20e6, 61.44e6}) {
        for (const double width_hz : {3e3, 8.33e3, 20e3, 47e3, 200e3}) {
            if (width_hz > rate_hz) {
                continue;
            }
            SCOPED_TRACE(testing::Message() << rate_hz << " / " << width_hz);
            const stream_facts facts = facts_of("ci16_le", rate_hz, 1000);
            const auto front = front_for(facts, {0.0, false, width_hz});
            const std::size_t steps = front->decimation();
            EXPECT_DOUBLE_EQ(front->output_rate_hz() * static_cast<double>(steps), rate_hz);
            EXPECT_LE(steps, 64U);
            if (steps > 1) {
                EXPECT_GE(front->output_rate_hz(), 8.0 * width_hz);
            }
            if (steps < 64) {
                EXPECT_LT(front->output_rate_hz(), 16.0 * width_hz);
            }
            EXPECT_EQ(front->lead(),
                      2 * front->delay_outputs() * steps); // a whole number of outputs
            EXPECT_EQ(front->cell() % steps, 0U);
            EXPECT_GE(front->cell(), 1024U);
            EXPECT_LT(front->cell(), 1024U + steps);
            EXPECT_LE(front->lead(), front->cell());
        }
    }
}

TEST(FrontEnd, PassesTheChannelAndStopsWhatWouldFoldIntoIt) {
    for (const double rate_hz : {1.024e6, 2.4e6, 20e6}) {
        const double width_hz = 17.3e3;
        const auto front = front_for(facts_of("ci16_le", rate_hz, 1000), {1e5, false, width_hz});
        const double out_hz = front->output_rate_hz();
        for (double hz = 0.0; hz <= width_hz / 2.0; hz += width_hz / 50.0) {
            EXPECT_NEAR(20.0 * std::log10(front->response(0, hz)), 0.0, 0.001);
            EXPECT_EQ(front->response(0, hz), front->response(0, -hz));
        }
        for (double fold_hz = out_hz; fold_hz <= rate_hz / 2.0; fold_hz += out_hz) {
            for (double hz = -0.75; hz <= 0.75; hz += 0.05) {
                EXPECT_LT(std::abs(front->response(0, fold_hz + hz * width_hz)), 1e-5); // -100 dB
            }
        }
    }
}

TEST(FrontEnd, ToneComesOutWithTheAmplitudeThatResponseStates) {
    const double rate_hz = 1.92e6, width_hz = 31.7e3, carrier_hz = -412.345e3;
    const channel_plan plan{carrier_hz, false, width_hz};
    for (const double hz : {0.0, 0.4 * width_hz, -width_hz, 3.3 * width_hz, -6.0 * width_hz}) {
        const auto tone = exponential(carrier_hz + hz, rate_hz, 40000);
        const stream_facts facts = facts_of("cf32_le", rate_hz, tone.size());
        const auto front = front_for(facts, plan);
        const auto iq = process(*front, facts, bytes_of(tone), 0);
        const std::size_t edge = 2 * front->delay_outputs();
        for (std::size_t n = edge; n + edge < iq.size(); ++n) {
            ASSERT_NEAR(static_cast<double>(std::abs(iq[n])), std::abs(front->response(0, hz)),
                        float_accuracy);
        }
    }
}

TEST(FrontEnd, CarrierLandsAtZeroHertzExactlyHoweverLateInTheRecording) {
    // 3.2 MHz at 20 MS/s is 4/25 of a turn a sample: whole numbers give its phase at any index.
    const double rate_hz = 20e6, phase = 0.7;
    const channel_plan plan{3.2e6, false, 20e3};
    for (const std::int64_t first : {std::int64_t{0}, std::int64_t{987'654'321'017}}) {
        std::vector<cf32> tone(30000);
        for (std::size_t n = 0; n < tone.size(); ++n) {
            const auto twentyfifths = (4 * ((first + static_cast<std::int64_t>(n)) % 25)) % 25;
            tone[n] =
                cf32{std::polar(1.0, two_pi * static_cast<double>(twentyfifths) / 25.0 + phase)};
        }
        const stream_facts facts = facts_of("cf32_le", rate_hz, tone.size());
        const auto front = front_for(facts, plan);
        const auto iq = process(*front, facts, bytes_of(tone), first);
        const std::size_t edge = 2 * front->delay_outputs();
        const cf32 expected{std::polar(1.0, phase)};
        // A step of 2^-64 of a turn, rounded, has drifted by 1e12 x 2^-65 of one by then.
        for (std::size_t n = edge; n + edge < iq.size(); ++n) {
            ASSERT_NEAR(std::abs(iq[n] - expected), 0.0F, 4e-7F);
        }
    }
}

TEST(FrontEnd, OutputStandsAtTheInputSampleThatTheDelayNames) {
    const double rate_hz = 2.4e6, width_hz = 20e3;
    const channel_plan plan{0.0, false, width_hz};
    std::vector<cf32> impulse(20000);
    const stream_facts facts = facts_of("cf32_le", rate_hz, impulse.size());
    const auto front = front_for(facts, plan);
    ASSERT_EQ(front->decimation(), 15U);
    impulse[15 * 600] = 1.0F;
    const auto iq = process(*front, facts, bytes_of(impulse), 0);
    ASSERT_EQ(iq.size(), (impulse.size() + 14) / 15 + front->delay_outputs());
    const std::size_t centre = 600 + front->delay_outputs();
    for (std::size_t k = 1; k <= front->delay_outputs(); ++k) {
        EXPECT_LT(std::abs(iq[centre + k]), std::abs(iq[centre]));
        EXPECT_EQ(iq[centre + k], iq[centre - k]); // linear phase about it
    }
    EXPECT_EQ(iq[centre + front->delay_outputs() + 1], cf32{});
}

TEST(FrontEnd, RealSineOfFullScaleIsAConstantOfMagnitudeOne) {
    const double rate_hz = 1.92e6, carrier_hz = 456.7e3, phase = 1.1;
    std::vector<float> sine(60000);
    for (std::size_t n = 0; n < sine.size(); ++n) {
        const double turns = std::fmod(carrier_hz / rate_hz * static_cast<double>(n), 1.0);
        sine[n] = static_cast<float>(std::cos(two_pi * turns + phase));
    }
    const stream_facts facts = facts_of("rf32_le", rate_hz, sine.size());
    const auto front = front_for(facts, {carrier_hz, false, 20e3});
    const auto iq = process(*front, facts, bytes_of(sine), 0);
    const cf32 expected{std::polar(1.0, phase)};
    const std::size_t edge = 2 * front->delay_outputs();
    for (std::size_t n = edge; n + edge < iq.size(); ++n) {
        ASSERT_LT(std::abs(iq[n] - expected), 1e-5F); // the image at -carrier is 100 dB down
    }
}

TEST(FrontEnd, CountsTheBlockAloneCellByCell) {
    const stream_facts facts = facts_of("cf32_le", 1e6, 5000);
    const auto front = front_for(facts, {0.0, false, 20e3});
    std::vector<cf32> iq(5000, cf32{0.5F, -0.25F});
    iq[10] = {std::numeric_limits<float>::quiet_NaN(), 0.0F};
    iq[4999] = {0.0F, std::numeric_limits<float>::infinity()};
    raw_counts counts;
    process(*front, facts, bytes_of(iq), 7000, &counts);
    ASSERT_EQ(counts.cells.size(), (5000 + front->cell() - 1) / front->cell());
    EXPECT_EQ(counts.cells[0].i, 0.5 * static_cast<double>(front->cell() - 1));
    EXPECT_EQ(counts.cells[1].qq, 0.0625 * static_cast<double>(front->cell()));
    ASSERT_EQ(counts.non_finite.size(), 2U);
    EXPECT_EQ(counts.non_finite[0].first, 7010);
    EXPECT_EQ(counts.non_finite[1].first, 11999);
    EXPECT_EQ(counts.zeroed, 2U);

    raw_block later; // lead counts in no sum
    const auto frames = bytes_of(iq);
    later.bytes = frames;
    later.lead = front->lead();
    later.count = 5000 - later.lead;
    later.first = static_cast<sample_index>(later.lead);
    std::vector<cf32> filtered(front->outputs(later));
    const std::span<cf32> out{filtered};
    front->process(later, *front->make_workspace(later.count), counts, std::span{&out, 1});
    EXPECT_EQ(counts.zeroed, 1U);
    double i = 0.0;
    for (const cell_sums& sums : counts.cells) {
        i += sums.i;
    }
    EXPECT_EQ(i, 0.5 * static_cast<double>(later.count - 1));
}

TEST(FrontEnd, SeveralChannelsAtOnceGiveWhatEachGivesAlone) {
    const double rate_hz = 2.4e6;
    const auto tone = exponential(200e3, rate_hz, 30000, 0.5);
    const stream_facts facts = facts_of("cf32_le", rate_hz, tone.size());
    const std::vector<channel_plan> plans{{200e3, false, 20e3}, {-700e3, false, 20e3}};
    const auto front = front_end::make(facts, plans);
    raw_block block;
    const auto frames = bytes_of(tone);
    block.bytes = frames;
    block.count = tone.size();
    std::vector<std::vector<cf32>> iq(2, std::vector<cf32>(front->outputs(block)));
    const std::vector<std::span<cf32>> out{iq[0], iq[1]};
    raw_counts counts;
    counts.cells.reserve(30);
    front->process(block, *front->make_workspace(block.count), counts, out);
    for (std::size_t k = 0; k < plans.size(); ++k) {
        auto alone = process(*front_for(facts, plans[k]), facts, frames, 0);
        alone.resize(iq[k].size());
        EXPECT_TRUE(same_bits(iq[k], alone));
    }
}

TEST(FrontEnd, WithoutChannelsItCountsTheSamplesOnly) {
    const auto iq = exponential(1000.0, 48e3, 5000, 0.25);
    const stream_facts facts = facts_of("cf32_le", 48e3, iq.size());
    const auto front = front_end::make(facts, {});
    EXPECT_EQ(front->lead(), 0U);
    EXPECT_EQ(front->delay_outputs(), 0U);
    EXPECT_GE(front->cell(), 1U);
    raw_block block;
    const auto frames = bytes_of(iq);
    block.bytes = frames;
    block.count = iq.size();
    block.ends_stretch = true;
    raw_counts counts;
    counts.cells.reserve(iq.size() / front->cell() + 1);
    front->process(block, *front->make_workspace(block.count), counts, {});
    double power = 0.0;
    for (const cell_sums& sums : counts.cells) {
        power += sums.ii + sums.qq;
    }
    EXPECT_NEAR(power, 5000.0 / 16.0, 1e-3);
}

TEST(FrontEnd, MendsTheImageBeforeTheChannelAndCountsSamplesAsRecorded) {
    const double rate_hz = 48e3;
    const cf64 k{0.1, -0.05};
    auto iq = exponential(-700.0, rate_hz, 20000, 0.5);
    double recorded = 0.0;
    for (cf32& z : iq) {
        z = cf32{cf64{z} + k * std::conj(cf64{z})};
        recorded += std::norm(cf64{z});
    }
    const stream_facts facts = facts_of("cf32_le", rate_hz, iq.size());
    const channel_plan at_image{700.0, false, 1000.0}, at_line{-700.0, false, 1000.0};
    const iq_balance balance = balance_from_image(k, 0.0);
    const auto level = [&](const channel_plan& plan, const std::optional<iq_balance>& mend) {
        const channel_run run{facts, bytes_of(iq), plan, 16, mend};
        return largest_magnitude(settled(run));
    };
    EXPECT_NEAR(level(at_image, {}), 0.5 * std::abs(k), 1e-4);
    EXPECT_LT(level(at_image, balance), 1e-5); // what the filter leaves of the line
    EXPECT_NEAR(level(at_line, balance), 0.5, 1e-4);
    raw_counts counts;
    process(*front_end::make(facts, {&at_line, 1}, balance), facts, bytes_of(iq), 0, &counts);
    double counted = 0.0;
    for (const cell_sums& sums : counts.cells) {
        counted += sums.ii + sums.qq;
    }
    EXPECT_NEAR(counted / recorded, 1.0, 1e-9);
}

TEST(FrontEnd, CarrierThatNoStretchHoldsIsRefusedByName) {
    stream_facts facts = facts_of("ci16_le", 1e6, 1000);
    const auto refused = caught([&] { (void)front_for(facts, {600e3, false, 20e3}); });
    EXPECT_EQ(refused.exit_status, 3);
    EXPECT_TRUE(refused.says("memory"));
    EXPECT_TRUE(refused.says("--carrier"));
    facts.stretches.front().centre_hz = 100e6;
    EXPECT_EQ(caught([&] { (void)front_for(facts, {102e6, true, 20e3}); }).exit_status, 3);
    EXPECT_FALSE(caught([&] { (void)front_for(facts, {100.2e6, true, 20e3}); }).kind);
}

} // namespace
} // namespace tonewalk::test
