// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <algorithm>
#include <cstddef>
#include <span>
#include <vector>

namespace tonewalk {

/// The last frames that a source in order has handed out, for the lead of its next block.
class frame_history {
public:
    /// Writes the last `frames` of them, or what there is, to the start of `slot`; returns how
    /// many.
    std::size_t give(std::span<std::byte> slot, std::size_t frames, std::size_t frame_bytes) const {
        const std::size_t given = std::min(frames, kept_.size() / frame_bytes);
        std::copy_n(kept_.end() - static_cast<std::ptrdiff_t>(given * frame_bytes),
                    given * frame_bytes, slot.begin());
        return given;
    }
    /// Keeps the last `frames` of a block, its lead included.
    void keep(std::span<const std::byte> block, std::size_t frames, std::size_t frame_bytes) {
        const auto last = block.last(std::min(block.size(), frames * frame_bytes));
        kept_.assign(last.begin(), last.end());
    }
    void clear() noexcept { kept_.clear(); }

private:
    std::vector<std::byte> kept_;
};

} // namespace tonewalk
