// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <memory>
#include <span>
#include <vector>

#include "tonewalk/base/sample.hpp"

namespace tonewalk {

enum class detector_kind { envelope, synchronous };

/// Turns baseband samples of one stretch into real audio at the same rate: carrier amplitude times
/// (1 + audio), full scale = 1.0, the carrier's share still in it.
///   output   number n belongs to input n: every delay is removed; as many outputs as inputs,
///   appended blocks   any split of the input yields identical output
class detector {
public:
    virtual ~detector() = default;
    virtual void begin() = 0; ///< starts a stretch, as new
    virtual void add(std::span<const cf32> in, std::vector<float>& out) = 0;
    virtual void end(std::vector<float>& out) = 0;
    /// How far the output lags while samples come in; already taken off the numbering.
    [[nodiscard]] virtual std::size_t lag_samples() const noexcept = 0;
    /// How far to either side a sample that was zeroed spoils the output.
    [[nodiscard]] virtual std::size_t spread_samples() const noexcept = 0;
};

/// `width_hz` is the channel's flat width; `rate_hz` that of the samples, at least the width.
[[nodiscard]] std::unique_ptr<detector> make_detector(detector_kind, double rate_hz,
                                                      double width_hz);

} // namespace tonewalk
