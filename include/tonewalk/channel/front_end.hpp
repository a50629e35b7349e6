// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <complex>
#include <memory>
#include <optional>
#include <span>
#include <vector>

#include "tonewalk/base/sample.hpp"
#include "tonewalk/channel/iq_balance.hpp"
#include "tonewalk/channel/plan.hpp"
#include "tonewalk/recording/convert.hpp"
#include "tonewalk/recording/stream.hpp"

namespace tonewalk {

/// Scratch memory of one worker, made once by front_end::make_workspace.
class workspace {
public:
    virtual ~workspace() = default;
};

/// From stored bytes to channel samples: a pure function of (bytes, absolute sample index),
/// immutable and shared by all threads. Convert, complex band-pass at the carrier's offset,
/// decimate, mix to 0 Hz with phase index x 64-bit step modulo 2^64.
class front_end {
public:
    virtual ~front_end() = default;
    /// Without plans it only counts raw samples; `mend` takes the receiver's image out before the
    /// filters. Throws error{malformed} where no stretch holds a plan's channel.
    static std::unique_ptr<const front_end> make(const stream_facts&, std::span<const channel_plan>,
                                                 const std::optional<iq_balance>& mend = {});

    [[nodiscard]] virtual std::size_t
    lead() const noexcept = 0; ///< history samples that a block wants
    [[nodiscard]] virtual std::size_t
    cell() const noexcept = 0; ///< blocks are whole cells from the stretch's start
    [[nodiscard]] virtual std::size_t decimation() const noexcept = 0; ///< input samples per output
    [[nodiscard]] virtual double output_rate_hz() const noexcept = 0;
    /// Outputs still inside the filter when a stretch ends: output n stands at input sample
    /// (n - delay_outputs()) x decimation() of its stretch.
    [[nodiscard]] virtual std::size_t delay_outputs() const noexcept = 0;
    /// One for every decimation() samples begun, and delay_outputs() more where a stretch ends.
    [[nodiscard]] virtual std::size_t outputs(const raw_block&) const noexcept = 0;
    [[nodiscard]] virtual bool holds(std::size_t channel, std::uint32_t stretch) const noexcept = 0;
    /// Amplitude response of `channel` at `hz` from its nominal carrier, from the taps themselves.
    [[nodiscard]] virtual double response(std::size_t channel, double hz) const noexcept = 0;
    [[nodiscard]] virtual std::unique_ptr<workspace>
    make_workspace(std::size_t block_samples) const = 0;
    /// outputs(block) samples to each channel's span; the counts are those of the block without its
    /// lead. Blocks of any whole number of cells give the same samples.
    virtual void process(const raw_block&, workspace&, raw_counts&,
                         std::span<const std::span<cf32>>) const noexcept = 0;
};

} // namespace tonewalk
