// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstdint>
#include <optional>
#include <string>

#include "input_file.hpp"

namespace tonewalk {

/// Where a container's samples begin and how many bytes of them its header states.
struct data_chunk {
    std::int64_t offset = 0;
    std::optional<std::int64_t> stated_bytes; ///< empty: the header leaves it open (streamed)
    bool stated_in_32_bits = true;
    unsigned valid_bits = 0; ///< of a component, where the header says; else 0
};

/// Of RIFF, RIFX, RF64, W64, AIFF, AU and CAF files; nothing for others and for files without
/// samples' chunk.
[[nodiscard]] std::optional<data_chunk> find_data_chunk(const input_file&);

/// Whether the file begins like one of those or like FLAC or Ogg.
[[nodiscard]] bool looks_like_container(const input_file&);

/// The bytes that truly hold samples, the header held against the file's length. A count left open,
/// 0 or 0xFFFFFFFF means: up to the file's end; one that has wrapped at 4 GiB is put right.
struct data_extent {
    byte_range range;
    std::string short_by;   ///< remark; empty unless the header states more than there is
    std::string overridden; ///< remark; empty unless the header states less than there is
};
/// Throws error{malformed} where bytes follow that are neither samples nor chunks.
[[nodiscard]] data_extent extent_of(const input_file&, const data_chunk&, std::size_t frame_bytes);

} // namespace tonewalk
