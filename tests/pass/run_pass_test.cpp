// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/pass/run_pass.hpp"

#include <chrono>
#include <limits>
#include <set>
#include <stdexcept>
#include <string>
#include <thread>

#include <gtest/gtest.h>

#include "pass_support.hpp"

namespace tonewalk::test {
namespace {

constexpr double rate_hz = 2.4e6;
const channel_plan absolute_carrier{100.3e6, true, 20e3};

struct recording {
    stream_facts facts;
    std::vector<std::byte> frames;
    [[nodiscard]] memory_source source() const { return {facts, frames}; }
};

/// Three stretches of awkward lengths: a gap, then another centre; the last one does not hold the
/// carrier. Samples that are no numbers: alone, two in neighbouring cells, at a stretch's very end.
const recording& gappy_recording() {
    static const recording made = [] {
        constexpr std::size_t counts[] = {611'953, 400'009, 90'001};
        auto iq = carrier_in_noise(300e3, rate_hz, counts[0]);
        const auto later = carrier_in_noise(-500e3, rate_hz, counts[1], 2);
        iq.insert(iq.end(), later.begin(), later.end());
        iq.resize(iq.size() + counts[2], cf32{0.125F, 0.25F});
        const float nan = std::numeric_limits<float>::quiet_NaN();
        for (const std::size_t n : {std::size_t{100'000}, std::size_t{205'000},
                                    std::size_t{205'700}, counts[0] - 1, counts[0] + 300'000}) {
            iq[n] = {nan, 0.5F};
        }
        recording r{facts_of("cf32_le", rate_hz, counts[0]), bytes_of(iq)};
        r.facts.stretches.front().centre_hz = 100e6;
        sample_index first = static_cast<sample_index>(counts[0]);
        r.facts.stretches.push_back(
            {first, static_cast<sample_index>(counts[1]), first + 1'000'001, 100.8e6});
        first += static_cast<sample_index>(counts[1]);
        r.facts.stretches.push_back(
            {first, static_cast<sample_index>(counts[2]), first + 1'000'001, 150e6});
        return r;
    }();
    return made;
}

outcome run_gappy(unsigned threads, std::size_t block_bytes) {
    memory_source source = gappy_recording().source();
    run_control control;
    control.threads = threads;
    return run_through(source, absolute_carrier, control, {block_bytes});
}

recording plain_recording(std::size_t samples) {
    return {facts_of("cf32_le", rate_hz, samples),
            bytes_of(carrier_in_noise(300e3, rate_hz, samples))};
}
const channel_plan plain_carrier{300e3, false, 20e3};

TEST(SinglePass, ThreadsAndBlockSizesNeverChangeABit) {
    const outcome plain = run_gappy(1, 256 * 1024);
    EXPECT_EQ(plain.report.end, pass_end::complete);
    EXPECT_EQ(plain.report.samples, 611'953 + 400'009 + 90'001);
    ASSERT_EQ(plain.heard.stretches.size(), 3U);
    EXPECT_TRUE(plain.heard.finished);
    for (const unsigned threads : {1U, 2U, 3U, 7U}) {
        for (const std::size_t block_bytes : {65'536U, 1'048'576U, 65'537U, 99'991U, 524'287U}) {
            SCOPED_TRACE(testing::Message() << threads << " threads, " << block_bytes << " bytes");
            const outcome other = run_gappy(threads, block_bytes);
            EXPECT_EQ(other.report.end, pass_end::complete);
            expect_same(plain, other);
            ASSERT_EQ(other.report.blocks_per_worker.size(), threads);
            for (const std::uint64_t blocks : other.report.blocks_per_worker) {
                EXPECT_GT(blocks, 0U);
            }
        }
    }
}

TEST(SinglePass, CarrierIsFollowedThroughTheGapAndTheOtherCentre) {
    const outcome heard = run_gappy(2, 65'536);
    const auto& stretches = heard.heard.stretches;
    EXPECT_TRUE(stretches[0].about.held && stretches[1].about.held);
    EXPECT_FALSE(stretches[2].about.held);
    for (std::size_t k = 0; k < 2; ++k) {
        std::complex<double> sum = 0.0;
        double count = 0.0;
        for (std::size_t n = 100; n + 100 < stretches[k].iq.size(); ++n) {
            if (!stretches[k].touched[n]) {
                sum += std::complex<double>{stretches[k].iq[n]};
                count += 1.0;
            }
        }
        EXPECT_NEAR(std::abs(sum) / count, 0.5, 0.002); // noise: 0.16 / sqrt(samples)
    }
    EXPECT_TRUE(heard.raw.doubts.has(note_code::non_finite_samples));
}

TEST(SinglePass, EveryWorkerGetsABlockAsSoonAsThereAreAsManyBlocks) {
    for (const unsigned threads : {2U, 5U, 16U}) {
        const recording r = plain_recording(threads * 4096); // a block is 4 cells of 1080 at most
        memory_source source = r.source();
        run_control control;
        control.threads = threads;
        const outcome all = run_through(source, plain_carrier, control, {8 * 1200});
        EXPECT_EQ(all.report.samples, threads * 4096);
        for (const std::uint64_t blocks : all.report.blocks_per_worker) {
            EXPECT_GT(blocks, 0U);
        }
    }
}

TEST(SinglePass, MoreWorkersThanBlocksStillEnds) {
    const recording r = plain_recording(1500);
    for (const unsigned threads : {2U, 16U, 100U}) {
        memory_source source = r.source();
        run_control control;
        control.threads = threads;
        const outcome all = run_through(source, plain_carrier, control);
        EXPECT_EQ(all.report.samples, 1500);
        EXPECT_EQ(all.report.blocks_per_worker.size(), std::min(threads, 16U));
    }
}

/// Sees the slots that the pass offers.
class slot_watcher final : public memory_source {
public:
    using memory_source::memory_source;
    std::set<std::pair<const std::byte*, std::size_t>> slots;
    std::optional<raw_block> claim(std::span<std::byte> slot, std::size_t lead) override {
        slots.insert({slot.data(), slot.size()});
        return memory_source::claim(slot, lead);
    }
};

TEST(SinglePass, RingOfSlotsStaysWithinEightMebibytes) {
    const recording r = plain_recording(2'000'000);
    for (const unsigned threads : {1U, 2U, 16U}) {
        slot_watcher source{r.facts, r.frames};
        run_control control;
        control.threads = threads;
        run_through(source, plain_carrier, control, {1024 * 1024});
        std::size_t bytes = 0;
        for (const auto& slot : source.slots) {
            bytes += slot.second;
        }
        EXPECT_LE(bytes, 8U * 1024 * 1024);
        EXPECT_LE(source.slots.size(), threads + 2);
    }
}

class progress_recorder final : public progress_sink {
public:
    std::vector<std::int64_t> done;
    void advance(std::int64_t samples_done, std::optional<std::int64_t> total) override {
        EXPECT_EQ(total, 3'000'000);
        done.push_back(samples_done);
    }
};

/// Takes its time, so that a short recording lasts.
class slow_sink final : public baseband_sink {
public:
    void begin_stretch(const baseband_stretch&) override {}
    void add(const baseband_block&) override {
        std::this_thread::sleep_for(std::chrono::milliseconds{4});
    }
    void end_stretch() override {}
    void finish() override {}
};

TEST(SinglePass, ProgressNeverGoesBackAndComesTenTimesASecondAtMost) {
    const recording r = plain_recording(3'000'000);
    memory_source source = r.source();
    progress_recorder progress;
    slow_sink slow;
    run_control control;
    control.threads = 3;
    control.progress = &progress;
    const auto began = std::chrono::steady_clock::now();
    run_through(source, plain_carrier, control, {65'536}, &slow);
    const std::chrono::duration<double> lasted = std::chrono::steady_clock::now() - began;
    EXPECT_LE(static_cast<double>(progress.done.size()), 10.0 * lasted.count() + 1.0);
    ASSERT_GT(progress.done.size(), 5U);
    for (std::size_t k = 1; k < progress.done.size(); ++k) {
        EXPECT_GT(progress.done[k], progress.done[k - 1]);
    }
    EXPECT_LE(progress.done.back(), 3'000'000);
}

/// Throws like a meter whose disk is full.
class failing_sink final : public baseband_sink {
public:
    void begin_stretch(const baseband_stretch&) override {}
    void add(const baseband_block& block) override {
        if (block.first > 1000) {
            throw error{fault::unwritable, "no space is left", "spool", "make room"};
        }
    }
    void end_stretch() override {}
    void finish() override { ADD_FAILURE() << "finished after it threw"; }
};

TEST(SinglePass, WhatAMeterThrowsComesOutOfThePass) {
    const recording r = plain_recording(1'000'000);
    for (const unsigned threads : {1U, 2U, 7U}) {
        memory_source source = r.source();
        failing_sink failing;
        run_control control;
        control.threads = threads;
        try {
            run_through(source, plain_carrier, control, {65'536}, &failing);
            FAIL() << "nothing was thrown";
        } catch (const error& problem) {
            EXPECT_EQ(problem.exit_status(), 4);
        }
    }
}

} // namespace
} // namespace tonewalk::test
