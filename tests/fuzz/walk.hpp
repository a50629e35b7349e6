// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include "tonewalk/recording/stream.hpp"

namespace tonewalk::fuzz {

/// Stretches in the order in which a recording gives them.
class stretch_order {
public:
    void add(const stretch_facts&); ///< none empty, none sharing samples or time with one before
    [[nodiscard]] sample_index stored() const noexcept { return stored_; } ///< up to where, so far

private:
    sample_index stored_ = 0, position_ = 0;
};

/// Holds a recording's facts against what its readers rely on, then reads its opening, its first
/// blocks and its last sample.
void walk(block_source&);

} // namespace tonewalk::fuzz
