// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <span>
#include <vector>

#include "tonewalk/base/sample.hpp"

namespace tonewalk {

/// Ranges of samples that do not count, in ascending order and never touching each other.
class sample_gaps {
public:
    void clear() noexcept { ranges_.clear(); }
    /// Adds ranges, each `spread` longer at both ends; ranges may repeat or overlap earlier ones.
    void add(std::span<const sample_range>, sample_index spread = 0);
    [[nodiscard]] bool touches(sample_index first, sample_index count) const noexcept;
    [[nodiscard]] bool contains(sample_index n) const noexcept { return touches(n, 1); }
    void forget_before(sample_index) noexcept; ///< drops ranges that end at or before this sample
    [[nodiscard]] std::span<const sample_range> ranges() const noexcept { return ranges_; }

private:
    void add(sample_range);
    std::vector<sample_range> ranges_;
};

} // namespace tonewalk
