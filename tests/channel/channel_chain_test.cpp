// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/channel/channel_chain.hpp"

#include <cmath>
#include <limits>
#include <stdexcept>

#include <gtest/gtest.h>

#include "channel_support.hpp"
#include "tonewalk/base/random.hpp"

namespace tonewalk::test {
namespace {

double db(double amplitude_ratio) {
    return 20.0 * std::log10(amplitude_ratio);
}

channel_run run_on(const std::vector<cf32>& iq, double rate_hz, const channel_plan& plan,
                   std::size_t cells_a_block = 16) {
    return {facts_of("cf32_le", rate_hz, iq.size()), bytes_of(iq), plan, cells_a_block};
}

/// Rates and widths without a common measure; with no, one and two steps before the channel filter.
struct band {
    double rate_hz, width_hz;
};
constexpr band bands[] = {{48e3, 9.1e3},    {48e3, 3.3e3},    {250e3, 20e3},
                          {1.9531e6, 17e3}, {2.4e6, 9.973e3}, {61.44e6, 50.3e3}};

channel_chain chain_for(const band& b, const front_end& front, const stream_facts& facts) {
    return {front, 0, {0.0, false, b.width_hz}, facts};
}

TEST(ChannelChain, ResponseIsFlatOverTheWidthAndAHundredDecibelsDownFromThreeQuarters) {
    for (const band& b : bands) {
        SCOPED_TRACE(testing::Message() << b.rate_hz << " / " << b.width_hz);
        const stream_facts facts = facts_of("cf32_le", b.rate_hz, 1000);
        const channel_plan plan{0.0, false, b.width_hz};
        const auto front = front_end::make(facts, std::span{&plan, 1});
        const channel_chain chain = chain_for(b, *front, facts);
        EXPECT_GE(chain.rate_hz(), 4.0 * b.width_hz);
        EXPECT_LE(chain.rate_hz(), 6.0 * b.width_hz);
        EXPECT_DOUBLE_EQ(chain.rate_hz() * static_cast<double>(chain.decimation()), b.rate_hz);
        for (double hz = -0.5; hz <= 0.5; hz += 0.01) {
            EXPECT_NEAR(db(chain.response(hz * b.width_hz)), 0.0, 0.005);
        }
        const double step_hz = std::max(0.013 * b.width_hz, b.rate_hz / 20000.0);
        for (double hz = 0.75 * b.width_hz; hz <= b.rate_hz / 2.0; hz += step_hz) {
            EXPECT_LT(std::abs(chain.response(hz)), 1e-5) << hz;
            EXPECT_LT(std::abs(chain.response(-hz)), 1e-5) << -hz;
        }
    }
}

/// Tones that the first or the second decimation folds into the channel, or that stand at its edge.
std::vector<double> worst_offsets(const channel_run& run, double rate_hz, double width_hz) {
    std::vector<double> all;
    const double front_hz = run.front->output_rate_hz(), last_hz = run.chain.rate_hz();
    const double near_hz = 0.75 * width_hz;
    for (const double fold_hz : {last_hz, 2.0 * last_hz, front_hz, 2.0 * front_hz,
                                 std::floor(rate_hz / 2.0 / front_hz) * front_hz, 0.0}) {
        for (const double from_fold_hz : {-near_hz, -0.21 * width_hz, 0.13 * width_hz, near_hz}) {
            const double hz = std::abs(fold_hz + from_fold_hz);
            if (hz >= near_hz && hz < rate_hz / 2.0) {
                all.push_back(hz);
                all.push_back(-hz);
            }
        }
    }
    return all;
}

TEST(ChannelChain, ImagesAndAliasesAreNinetyDecibelsDownWhereverTheCarrierStands) {
    for (const band& b : bands) {
        // Near the middle, between, and 5 % of the band from its edge.
        for (const double place : {0.0123, -0.297, 0.45}) {
            const double carrier_hz = place * b.rate_hz;
            const channel_plan plan{carrier_hz, false, b.width_hz};
            if (std::abs(place) * b.rate_hz + b.width_hz / 2.0 > b.rate_hz / 2.0) {
                continue;
            }
            const channel_run empty = run_on(std::vector<cf32>(1), b.rate_hz, plan);
            const std::size_t samples =
                empty.chain.decimation() * (6 * empty.chain.settle_samples() + 64);
            for (const double offset_hz : worst_offsets(empty, b.rate_hz, b.width_hz)) {
                SCOPED_TRACE(testing::Message() << b.rate_hz << " / " << b.width_hz << ", "
                                                << carrier_hz << " + " << offset_hz);
                const auto tone = exponential(carrier_hz + offset_hz, b.rate_hz, samples);
                const channel_run run = run_on(tone, b.rate_hz, plan);
                EXPECT_LT(db(largest_magnitude(settled(run))), -90.0);
            }
        }
    }
}

TEST(ChannelChain, AllDelayIsRemovedToAFractionOfASample) {
    for (const band& b : bands) {
        const double carrier_hz = 0.17 * b.rate_hz, phase = 0.4;
        const channel_plan plan{carrier_hz, false, b.width_hz};
        for (const double offset_hz : {-0.49 * b.width_hz, 0.07 * b.width_hz, 0.49 * b.width_hz}) {
            SCOPED_TRACE(testing::Message()
                         << b.rate_hz << " / " << b.width_hz << ", " << offset_hz);
            const double tone_hz = carrier_hz + offset_hz;
            const channel_run empty = run_on(std::vector<cf32>(1), b.rate_hz, plan);
            const std::size_t samples =
                empty.chain.decimation() * (6 * empty.chain.settle_samples() + 64);
            const channel_run run =
                run_on(exponential(tone_hz, b.rate_hz, samples, 0.8, phase), b.rate_hz, plan);
            const auto& iq = run.iq();
            ASSERT_EQ(iq.size(), (samples - 1) / run.chain.decimation() + 1);
            const double amplitude = 0.8 * run.chain.response(offset_hz);
            const std::size_t edge = 2 * run.chain.settle_samples() + 2;
            for (std::size_t n = edge; n + edge < iq.size(); ++n) {
                const double t_s = static_cast<double>(n) / run.chain.rate_hz();
                const auto expected =
                    std::polar(amplitude, two_pi * std::fmod(offset_hz * t_s, 1.0) + phase);
                ASSERT_LT(std::abs(std::complex<double>{iq[n]} - expected), 1e-6);
            }
        }
    }
}

TEST(ChannelChain, ImpulseAppearsAtItsOwnSampleAndIsSymmetric) {
    for (const band& b : bands) {
        SCOPED_TRACE(testing::Message() << b.rate_hz << " / " << b.width_hz);
        const channel_plan plan{0.0, false, b.width_hz};
        const channel_run empty = run_on(std::vector<cf32>(1), b.rate_hz, plan);
        const std::size_t at = 2 * empty.chain.settle_samples() + 3;
        std::vector<cf32> impulse(empty.chain.decimation() * 2 * at);
        impulse[at * empty.chain.decimation()] = 1.0F;
        const channel_run run = run_on(impulse, b.rate_hz, plan);
        const auto& iq = run.iq();
        for (std::size_t k = 1; k < at; ++k) {
            EXPECT_LT(std::abs(iq[at + k]), std::abs(iq[at]));
            EXPECT_LT(std::abs(iq[at + k] - iq[at - k]), 1e-8F);
        }
        EXPECT_EQ(iq[at - run.chain.settle_samples() - 1], cf32{}); // beyond half the whole filter
        EXPECT_EQ(iq[at + run.chain.settle_samples() + 1], cf32{});
    }
}

TEST(ChannelChain, NoiseBandwidthIsWhatWhiteInputComesOutWith) {
    // Output power of white noise of density 1: rate x sum of |h|^2, h taken from the impulses at
    // every phase of the decimation.
    const band b{250e3, 20e3};
    const channel_plan plan{0.0, false, b.width_hz};
    const channel_run empty = run_on(std::vector<cf32>(1), b.rate_hz, plan);
    const std::size_t steps = empty.chain.decimation();
    ASSERT_GT(steps, 1U);
    double energy = 0.0;
    for (std::size_t phase = 0; phase < steps; ++phase) {
        std::vector<cf32> impulse(steps * 200);
        impulse[steps * 100 + phase] = 1.0F;
        const channel_run run = run_on(impulse, b.rate_hz, plan);
        for (const cf32 z : run.iq()) {
            energy += static_cast<double>(std::norm(z));
        }
    }
    EXPECT_NEAR(empty.chain.noise_bandwidth_hz() / (energy * b.rate_hz), 1.0, 1e-5);
    EXPECT_GT(empty.chain.noise_bandwidth_hz(), b.width_hz);
    EXPECT_LT(empty.chain.noise_bandwidth_hz(), 1.5 * b.width_hz);
}

TEST(ChannelChain, RealInputsImageStaysOutEvenAtLowRates) {
    // No front-end filter at these rates: the channel filter alone stops what mirrors the carrier.
    const double rate_hz = 48e3, carrier_hz = 12.34e3, width_hz = 8e3;
    std::vector<float> sine(20000);
    for (std::size_t n = 0; n < sine.size(); ++n) {
        const double turns = std::fmod(carrier_hz / rate_hz * static_cast<double>(n), 1.0);
        sine[n] = static_cast<float>(0.5 * std::cos(two_pi * turns + 0.2));
    }
    const channel_run run{
        facts_of("rf32_le", rate_hz, sine.size()), bytes_of(sine), {carrier_hz, false, width_hz}};
    ASSERT_EQ(run.front->decimation(), 1U);
    for (const cf32 z : settled(run)) {
        ASSERT_LT(std::abs(z - cf32{std::polar(0.5, 0.2)}), 1e-5F);
    }
}

TEST(ChannelChain, WidthThatFillsTheBandPassesEverything) {
    const double rate_hz = 48e3;
    random_stream random{7};
    std::vector<cf32> noise(5000);
    for (cf32& z : noise) {
        z = {static_cast<float>(random.uniform(-1, 1)), static_cast<float>(random.uniform(-1, 1))};
    }
    const channel_run run = run_on(noise, rate_hz, {0.0, false, rate_hz});
    EXPECT_TRUE(same_bits(run.iq(), noise));
    EXPECT_EQ(run.chain.rate_hz(), rate_hz);
    EXPECT_EQ(run.chain.response(20e3), 1.0);
    EXPECT_NEAR(run.chain.noise_bandwidth_hz(), rate_hz, 1e-6);
}

TEST(ChannelChain, StopEdgeMovesToTheBandsEdgeWhereTheRateIsLow) {
    for (const double rate_in_widths : {1.05, 1.2, 1.5, 2.0, 3.9}) {
        const double width_hz = 30e3, rate_hz = rate_in_widths * width_hz;
        const stream_facts facts = facts_of("cf32_le", rate_hz, 1000);
        const channel_plan plan{0.0, false, width_hz};
        const auto front = front_end::make(facts, std::span{&plan, 1});
        const channel_chain chain{*front, 0, plan, facts};
        EXPECT_EQ(chain.rate_hz(), rate_hz);
        EXPECT_NEAR(db(chain.response(0.5 * width_hz)), 0.0, 0.005);
        EXPECT_LT(std::abs(chain.response(std::min(0.75, rate_in_widths / 2.0) * width_hz)), 1e-5);
    }
}

TEST(ChannelChain, SamplesCoverTheStretchFromItsFirstToItsLastInput) {
    for (const std::size_t samples : {1U, 2U, 59U, 60U, 61U, 1023U, 4097U}) {
        const channel_run run =
            run_on(std::vector<cf32>(samples, cf32{1.0F}), 2.4e6, {0.0, false, 9.973e3});
        EXPECT_EQ(run.iq().size(), (samples - 1) / run.chain.decimation() + 1);
        EXPECT_TRUE(run.heard.finished);
        EXPECT_LE(run.heard.longest_run, 4096U);
    }
}

TEST(ChannelChain, AnySplitGivesTheSameBits) {
    random_stream random{11};
    std::vector<cf32> noise(150'001);
    for (cf32& z : noise) {
        z = {static_cast<float>(random.gaussian()), static_cast<float>(random.gaussian())};
    }
    for (const band& b : {band{2.4e6, 9.973e3}, band{250e3, 20e3}, band{48e3, 9.1e3}}) {
        const channel_plan plan{0.21 * b.rate_hz, false, b.width_hz};
        const channel_run whole = run_on(noise, b.rate_hz, plan, 1000);
        for (const std::size_t cells : {1U, 2U, 7U, 13U}) {
            const channel_run split = run_on(noise, b.rate_hz, plan, cells);
            EXPECT_TRUE(same_bits(split.front_iq, whole.front_iq));
            EXPECT_TRUE(same_bits(split.iq(), whole.iq()));
        }
    }
}

TEST(ChannelChain, NonFiniteInputTouchesWhatItsFiltersReachAndNothingElse) {
    const band b{2.4e6, 9.973e3};
    const channel_plan plan{0.1e6, false, b.width_hz};
    const auto clean = exponential(0.1e6, b.rate_hz, 120'000);
    auto spoilt = clean;
    const std::size_t first = 40'000, last = 40'700; // within one cell: one range
    spoilt[first] = {std::numeric_limits<float>::quiet_NaN(), 0.0F};
    spoilt[last] = {0.0F, -std::numeric_limits<float>::infinity()};
    const channel_run good = run_on(clean, b.rate_hz, plan);
    ASSERT_EQ(first / good.front->cell(), last / good.front->cell());
    const channel_run bad = run_on(spoilt, b.rate_hz, plan);
    const auto& touched = bad.heard.stretches.at(0).touched;
    std::size_t touched_samples = 0, differing = 0;
    for (std::size_t n = 0; n < touched.size(); ++n) {
        const bool differs = good.iq()[n] != bad.iq()[n];
        ASSERT_TRUE(touched[n] || !differs) << n;
        touched_samples += touched[n] ? 1U : 0U;
        differing += differs ? 1U : 0U;
    }
    const double steps = static_cast<double>(bad.chain.decimation());
    EXPECT_GT(differing, 20U);
    EXPECT_NEAR(static_cast<double>(touched_samples),
                static_cast<double>(last - first) / steps +
                    2.0 * static_cast<double>(bad.chain.settle_samples()),
                2.0);
    for (const std::size_t cells : {1U, 3U, 100U}) {
        EXPECT_EQ(run_on(spoilt, b.rate_hz, plan, cells).heard.stretches.at(0).touched, touched);
    }
}

/// Three stretches: a gap inside, then another centre, then one that does not hold the carrier.
stream_facts stretched(std::size_t first, std::size_t second, std::size_t third) {
    stream_facts facts = facts_of("cf32_le", 1.0e6, first);
    facts.stretches.front().centre_hz = 100.0e6;
    facts.stretches.push_back({static_cast<sample_index>(first), static_cast<sample_index>(second),
                               static_cast<sample_index>(first) + 500'000, 100.1e6});
    facts.stretches.push_back({static_cast<sample_index>(first + second),
                               static_cast<sample_index>(third),
                               static_cast<sample_index>(first + second) + 500'000, 130.0e6});
    return facts;
}

TEST(ChannelChain, AbsoluteCarrierIsFollowedThroughStretchesOfOtherCentres) {
    const std::size_t first = 70'001, second = 50'003, third = 9'999;
    std::vector<cf32> iq = exponential(150e3, 1e6, first, 0.5);
    const auto later = exponential(50e3, 1e6, second, 0.25);
    iq.insert(iq.end(), later.begin(), later.end());
    iq.resize(iq.size() + third, cf32{0.9F});
    const channel_plan plan{100.15e6, true, 20e3};
    const channel_run run{stretched(first, second, third), bytes_of(iq), plan, 3};
    ASSERT_EQ(run.heard.stretches.size(), 3U);
    const std::size_t edge = run.chain.settle_samples() + 1;
    const double levels[] = {0.5, 0.25};
    for (std::size_t k = 0; k < 2; ++k) {
        const recorded_stretch& s = run.heard.stretches[k];
        EXPECT_TRUE(s.about.held);
        for (std::size_t n = edge; n + edge < s.iq.size(); ++n) {
            ASSERT_NEAR(static_cast<double>(std::abs(s.iq[n])), levels[k], 1e-6);
            ASSERT_LT(std::abs(s.iq[n] - s.iq[n - 1]), 1e-6F);
        }
    }
    EXPECT_DOUBLE_EQ(run.heard.stretches[1].about.start_s, 0.570001); // the gap counts
    const recorded_stretch& beyond = run.heard.stretches[2];
    EXPECT_FALSE(beyond.about.held);
    EXPECT_EQ(beyond.iq.size(), (third - 1) / run.chain.decimation() + 1);
    EXPECT_EQ(largest_magnitude(beyond.iq), 0.0);
}

TEST(ChannelChain, NothingOfOneStretchReachesTheNext) {
    const std::size_t first = 70'001, second = 50'003, third = 9'999;
    std::vector<cf32> iq(first + second + third, cf32{1e6F});
    const auto tone = exponential(50e3, 1e6, second);
    std::copy(tone.begin(), tone.end(), iq.begin() + static_cast<std::ptrdiff_t>(first));
    iq[first - 1] = {std::numeric_limits<float>::quiet_NaN(), 0.0F};
    iq[first + second] = {std::numeric_limits<float>::quiet_NaN(), 0.0F};
    const channel_plan plan{100.15e6, true, 20e3};
    const channel_run with{stretched(first, second, third), bytes_of(iq), plan};
    std::fill(iq.begin(), iq.begin() + static_cast<std::ptrdiff_t>(first), cf32{});
    std::fill(iq.begin() + static_cast<std::ptrdiff_t>(first + second), iq.end(), cf32{});
    const channel_run without{stretched(first, second, third), bytes_of(iq), plan};
    EXPECT_TRUE(same_bits(with.heard.stretches[1].iq, without.heard.stretches[1].iq));
    EXPECT_EQ(with.heard.stretches[1].touched, without.heard.stretches[1].touched);
    EXPECT_TRUE(with.heard.stretches[0].touched.back());
}

} // namespace
} // namespace tonewalk::test
