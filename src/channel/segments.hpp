// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <algorithm>
#include <vector>

#include "search_opening.hpp"

namespace tonewalk {

/// How what is looked at is cut up for a survey: 256 to 2^18 samples, four segments at least.
[[nodiscard]] inline std::size_t segment_size(std::size_t frames) noexcept {
    constexpr std::size_t least = 256, most = std::size_t{1} << 18;
    std::size_t size = least;
    while (2 * size <= frames / 4 && 2 * size <= most) {
        size *= 2;
    }
    return std::min(size, std::max<std::size_t>(frames, 1));
}

/// The longest segments worth taking where lines stand close: three at least, up to 2^20 samples.
[[nodiscard]] inline std::size_t finest_segment(std::size_t frames) noexcept {
    return std::min(frames / 2, std::size_t{1} << 20);
}

/// Hands each segment of `size` samples to `use`, in order; fewer than 16 overlap by half.
template <class Use>
void for_each_segment(const looked_at& what, std::size_t size, Use use) {
    constexpr std::size_t enough = 16;
    const std::size_t advance =
        what.frames / size >= enough ? size : std::max<std::size_t>(1, size / 2);
    std::vector<cf32> segment(size);
    for (std::size_t first = 0; first + size <= what.frames; first += advance) {
        what.convert(first, segment);
        use(std::span<const cf32>{segment});
    }
}

} // namespace tonewalk
