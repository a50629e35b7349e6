// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <span>
#include <vector>

#include "tonewalk/recording/convert.hpp"
#include "tonewalk/recording/stream.hpp"

namespace tonewalk {

/// Stored frames that are looked at, of one stretch.
struct looked_at {
    std::span<const std::byte> bytes;
    std::size_t frames = 0;
    const stream_facts* facts = nullptr;
    const sample_converter* converter = nullptr;
    double centre_shift_hz = 0.0; ///< of its stretch's centre, from the recording's

    /// Samples [first, first + out.size()).
    void convert(std::size_t first, std::span<cf32> out) const {
        const std::size_t frame_bytes = facts->frame_bytes();
        converter->convert(bytes.subspan(first * frame_bytes, out.size() * frame_bytes), out);
    }
    [[nodiscard]] double seconds() const noexcept {
        return static_cast<double>(frames) / facts->sample_rate_hz;
    }
};

/// What is searched, with the bytes where the source does not keep them itself.
struct opening {
    std::vector<std::byte> own; ///< of a probe; else empty
    looked_at what;
    [[nodiscard]] bool is_probe() const noexcept { return !own.empty(); }
};

/// The first 2 s or 32 MiB of what is to be measured, within its first stretch. Throws
/// error{malformed} where there are no samples at all.
[[nodiscard]] opening look_at_opening(block_source&, const sample_converter&);

/// Probes are spread evenly over a file.
inline constexpr std::size_t most_probes = 16;

/// A probe of fewer, where a stretch ends, is not worth a search.
inline constexpr std::size_t least_frames_searched = 256;

/// How many probes a file has room for without overlap, 1 at least.
[[nodiscard]] std::size_t probes_in(const stream_facts&);

/// 1 s (at most 32 MiB) of the recording, probe `k` of `probes`; seekable sources only.
[[nodiscard]] opening look_at_probe(block_source&, const sample_converter&, std::size_t k,
                                    std::size_t probes = most_probes);

} // namespace tonewalk
