// SPDX-License-Identifier: GPL-3.0-or-later
#include "stretch_samples.hpp"

#include <algorithm>

namespace tonewalk {

void stretch_samples::begin() {
    held_.clear();
    first_ = received_ = 0;
    gaps_.clear();
}

void stretch_samples::add(const baseband_block& block) {
    held_.insert(held_.end(), block.iq.begin(), block.iq.end());
    received_ += static_cast<sample_index>(block.iq.size());
    gaps_.add(block.non_finite);
}

std::span<const cf32> stretch_samples::record(sample_index first, std::size_t count) const {
    return std::span{held_}.subspan(static_cast<std::size_t>(first - first_), count);
}

bool stretch_samples::touched(sample_index first, std::size_t count) const noexcept {
    return gaps_.touches(first, static_cast<sample_index>(count));
}

/// Seldom moves what remains: when there is less of it than of what goes.
void stretch_samples::forget_before(sample_index first) {
    gaps_.forget_before(first);
    const sample_index needless = std::min(first, received_) - first_;
    if (2 * needless >= static_cast<sample_index>(held_.size())) {
        held_.erase(held_.begin(), held_.begin() + needless);
        first_ += needless;
    }
}

} // namespace tonewalk
