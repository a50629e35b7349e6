// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstdint>
#include <span>

#include "tonewalk/base/sample.hpp"

namespace tonewalk {

/// Front-end output of one channel for one block.
struct channel_block {
    std::span<const cf32> iq; ///< carrier near 0 Hz, at the front end's output rate
    sample_index samples = 0; ///< input samples that this block brought
    std::uint32_t stretch = 0;
    bool ends_stretch = false;
    bool held = true; ///< false: the stretch does not hold this channel, iq is zeros
    std::span<const sample_range> non_finite; ///< stored input indices that were zeroed
};

/// One channel behind the front end: later decimation, filter, meters. Serial, blocks in order.
class chain {
public:
    virtual ~chain() = default;
    virtual void add(const channel_block&) = 0; ///< throws what a meter throws
    /// After the last block (also of a stopped pass): ends an open stretch and closes every sink.
    virtual void finish() = 0;
};

/// One stretch as a meter sees it.
struct baseband_stretch {
    std::uint32_t index = 0;
    double start_s = 0.0; ///< of its first sample, from the recording's first sample, gaps included
    bool held = true;     ///< false: not measurable, samples are zeros (segments-skipped)
};

/// Channel samples at the chain's final rate. Sample n of a stretch stands exactly n / rate after
/// the stretch's first sample: every filter's delay is removed. Samples cover the stretch from its
/// first to its last input sample; filter transients reach settle_samples() into both ends.
struct baseband_block {
    std::span<const cf32> iq; ///< nominal carrier at 0 Hz, full scale = 1.0
    sample_index first = 0;   ///< index of iq[0] in the stretch
    std::span<const sample_range>
        non_finite; ///< baseband indices that zeroed input touches, filters' spread
                    ///< included; may reach beyond this block
};

/// Anything that listens to a channel: line meter, detector, recorder. Calls come from one thread
/// at a time.
class baseband_sink {
public:
    virtual ~baseband_sink() = default;
    virtual void begin_stretch(const baseband_stretch&) = 0;
    virtual void add(const baseband_block&) = 0;
    virtual void end_stretch() = 0;
    virtual void finish() = 0;
};

} // namespace tonewalk
