// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cmath>
#include <complex>
#include <numbers>
#include <span>
#include <vector>

#include "support/baseband_recorder.hpp"
#include "support/memory_source.hpp"
#include "tonewalk/channel/channel_chain.hpp"

namespace tonewalk::test {

inline constexpr double two_pi = 2.0 * std::numbers::pi;

/// amplitude e^(j (2 pi hz n / rate + phase)), n from 0.
inline std::vector<cf32> exponential(double hz, double rate_hz, std::size_t samples,
                                     double amplitude = 1.0, double phase = 0.0) {
    std::vector<cf32> out(samples);
    for (std::size_t n = 0; n < samples; ++n) {
        const double turns = std::fmod(hz / rate_hz * static_cast<double>(n), 1.0);
        out[n] = cf32{std::polar(amplitude, two_pi * turns + phase)};
    }
    return out;
}

/// Runs one channel over a recording, on one thread, in blocks of so many cells.
struct channel_run {
    channel_run(stream_facts facts, std::vector<std::byte> frames, const channel_plan& plan,
                std::size_t cells_a_block = 16, const std::optional<iq_balance>& mend = {})
        : source{std::move(facts), std::move(frames)},
          front{front_end::make(source.facts(), std::span{&plan, 1}, mend)}, chain{*front, 0, plan,
                                                                                   source.facts()} {
        chain.listen(heard);
        const std::size_t samples = cells_a_block * front->cell();
        const auto space = front->make_workspace(samples);
        std::vector<std::byte> slot((samples + front->lead()) * source.facts().frame_bytes());
        raw_counts counts;
        counts.cells.reserve(cells_a_block);
        counts.non_finite.reserve(cells_a_block);
        while (auto block = source.claim(slot, front->lead())) {
            source.fill(*block);
            std::vector<cf32> iq(front->outputs(*block));
            const std::span<cf32> out{iq};
            front->process(*block, *space, counts, std::span{&out, 1});
            chain.add({iq, static_cast<sample_index>(block->count), block->stretch,
                       block->ends_stretch, front->holds(0, block->stretch), counts.non_finite});
            front_iq.insert(front_iq.end(), iq.begin(), iq.end());
        }
        chain.finish();
    }
    [[nodiscard]] const std::vector<cf32>& iq() const { return heard.stretches.at(0).iq; }

    memory_source source;
    std::unique_ptr<const front_end> front;
    channel_chain chain;
    baseband_recorder heard;
    std::vector<cf32> front_iq; ///< of all stretches
};

/// The middle of a run, away from both ends' transients.
inline std::span<const cf32> settled(const channel_run& run) {
    const std::size_t edge = 2 * run.chain.settle_samples() + 2;
    const auto& all = run.iq();
    EXPECT_GT(all.size(), 2 * edge + 16);
    return std::span{all}.subspan(edge, all.size() - 2 * edge);
}

inline double largest_magnitude(std::span<const cf32> iq) {
    double largest = 0.0;
    for (const cf32 z : iq) {
        largest = std::max(largest, static_cast<double>(std::abs(z)));
    }
    return largest;
}

} // namespace tonewalk::test
