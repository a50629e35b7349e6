// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <memory>
#include <span>
#include <vector>

#include "tonewalk/channel/chain.hpp"
#include "tonewalk/channel/front_end.hpp"

namespace tonewalk {

/// The chain of one channel: decimates the front end's output to 4 to 6 times the width (no step is
/// left, and the rate stays the input's, where that is below 8 times), applies the channel filter
/// (flat to 0.005 dB over the width, 100 dB down from 0.75 width off the carrier; at the band's
/// edge where that is nearer), removes all delay, and hands the samples to its sinks in short runs.
class channel_chain final : public chain {
public:
    channel_chain(const front_end&, std::size_t channel, const channel_plan&, const stream_facts&);
    ~channel_chain() override;
    void listen(baseband_sink&); ///< before the first block; sinks outlive the chain
    void add(const channel_block&) override;
    void finish() override;

    [[nodiscard]] double rate_hz() const noexcept; ///< of the baseband samples
    [[nodiscard]] std::size_t
    decimation() const noexcept; ///< input samples per baseband sample, in all
    [[nodiscard]] std::size_t
    settle_samples() const noexcept; ///< half the whole filter, baseband samples
    [[nodiscard]] double
    response(double hz) const noexcept; ///< amplitude, front end included, 1 in the middle
    [[nodiscard]] double noise_bandwidth_hz() const noexcept; ///< of the whole filter

private:
    struct state;
    std::unique_ptr<state> state_;
};

} // namespace tonewalk
