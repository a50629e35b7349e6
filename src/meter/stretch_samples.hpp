// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <span>
#include <vector>

#include "tonewalk/base/sample.hpp"
#include "tonewalk/channel/chain.hpp"
#include "tonewalk/detect/sample_gaps.hpp"

namespace tonewalk {

/// The latest samples of a stretch, from the first that some record still needs, and which of them
/// non-finite input touches. Indices count from the stretch's first sample.
class stretch_samples {
public:
    void begin();
    void add(const baseband_block&);
    [[nodiscard]] sample_index received() const noexcept { return received_; }
    /// [first, first + count), all received and none forgotten.
    [[nodiscard]] std::span<const cf32> record(sample_index first, std::size_t count) const;
    [[nodiscard]] bool touched(sample_index first, std::size_t count) const noexcept;
    /// No record will ask for samples before `first`, which may not have arrived yet.
    void forget_before(sample_index first);

private:
    std::vector<cf32> held_; // from first_ on
    sample_index first_ = 0, received_ = 0;
    sample_gaps gaps_;
};

} // namespace tonewalk
