// SPDX-License-Identifier: GPL-3.0-or-later
#include "container_chunks.hpp"

#include <algorithm>
#include <array>
#include <bit>
#include <string_view>

#include <fmt/format.h>

#include "stored.hpp"
#include "tonewalk/base/error.hpp"

namespace tonewalk {
namespace {

constexpr std::int64_t four_gib = std::int64_t{1} << 32;
constexpr std::uint32_t open_count = 0xFFFFFFFF;

// How a kind of container writes its chunks: an identifier, a size, the content.
struct chunk_style {
    std::int64_t first = 12; // offset of the first chunk
    std::string_view data_id = "data";
    std::size_t id_bytes = 4, size_bytes = 4;
    bool big_endian = false;
    bool size_counts_header = false;
    std::int64_t alignment = 2;
};
constexpr chunk_style riff_style{};
constexpr chunk_style rifx_style{.big_endian = true};
constexpr chunk_style aiff_style{.data_id = "SSND", .big_endian = true};
constexpr chunk_style w64_style{
    .first = 40, .id_bytes = 16, .size_bytes = 8, .size_counts_header = true, .alignment = 8};
constexpr chunk_style caf_style{.first = 8, .size_bytes = 8, .big_endian = true, .alignment = 1};

template <class Number>
Number number_at(std::span<const std::byte> bytes, std::size_t at, bool big_endian) {
    return load<Number>(bytes.data() + at, big_endian != (std::endian::native == std::endian::big));
}

struct chunk {
    std::string id; // its first four letters
    std::int64_t content = 0, size = 0;
};

// The chunk whose header is at `at`; nothing where none fits in the file.
std::optional<chunk> chunk_at(const input_file& file, const chunk_style& style, std::int64_t at) {
    std::array<std::byte, 24> bytes{};
    const std::size_t header = style.id_bytes + style.size_bytes;
    if (file.read_at(at, std::span{bytes}.first(header)) < header)
        return std::nullopt;
    chunk found;
    for (std::size_t k = 0; k < 4; ++k)
        found.id += static_cast<char>(bytes[k]);
    const bool printable = std::all_of(found.id.begin(), found.id.end(),
                                       [](char letter) { return letter >= ' ' && letter <= '~'; });
    found.content = at + static_cast<std::int64_t>(header);
    found.size = style.size_bytes == 4
                     ? number_at<std::uint32_t>(bytes, style.id_bytes, style.big_endian)
                     : number_at<std::int64_t>(bytes, style.id_bytes, style.big_endian);
    if (style.size_counts_header)
        found.size = std::max(found.size, std::int64_t{0}) - static_cast<std::int64_t>(header);
    if (!printable)
        return std::nullopt;
    return found;
}

std::int64_t aligned(std::int64_t at, std::int64_t alignment) {
    return (at + alignment - 1) / alignment * alignment;
}

// The kind by the file's first letters; null for others.
const chunk_style* style_of(std::string_view letters) {
    if (letters == "RIFF" || letters == "RF64" || letters == "BW64")
        return &riff_style;
    if (letters == "RIFX")
        return &rifx_style;
    if (letters == "FORM")
        return &aiff_style;
    if (letters == "riff")
        return &w64_style;
    return letters == "caff" ? &caf_style : nullptr;
}

std::string first_letters(const input_file& file) {
    std::array<char, 4> letters{};
    const std::size_t read = file.read_at(0, std::as_writable_bytes(std::span{letters}));
    return {letters.data(), read};
}

// Bits of a component that carry the signal, from an extensible format chunk.
unsigned valid_bits_of(const input_file& file, const chunk& format, bool big_endian) {
    constexpr std::uint16_t extensible = 0xFFFE;
    std::array<std::byte, 20> bytes{};
    if (format.size < 20 || file.read_at(format.content, bytes) < bytes.size() ||
        number_at<std::uint16_t>(bytes, 0, big_endian) != extensible)
        return 0;
    return number_at<std::uint16_t>(bytes, 18, big_endian);
}

// The 64-bit size of the samples in an RF64's first chunk.
std::int64_t long_size_of(const input_file& file, const chunk& sizes) {
    std::array<std::byte, 16> bytes{};
    if (sizes.size < 16 || file.read_at(sizes.content, bytes) < bytes.size())
        return 0;
    return number_at<std::int64_t>(bytes, 8, false);
}

// AIFF and CAF put a few bytes of their own before the samples.
data_chunk data_of(const input_file& file, const chunk_style& style, const chunk& found) {
    std::int64_t before = 0;
    if (&style == &caf_style)
        before = 4;
    if (&style == &aiff_style) {
        std::array<std::byte, 4> offset{};
        file.read_all_at(found.content, offset);
        before = 8 + std::int64_t{number_at<std::uint32_t>(offset, 0, true)};
    }
    data_chunk data;
    data.offset = found.content + before;
    data.stated_in_32_bits = style.size_bytes == 4;
    const bool open = style.size_bytes == 4 ? found.size == open_count : found.size < 0;
    if (!open)
        data.stated_bytes = std::max<std::int64_t>(found.size - before, 0);
    return data;
}

std::optional<data_chunk> walk_to_data(const input_file& file, const chunk_style& style) {
    std::int64_t long_size = 0;
    unsigned valid_bits = 0;
    for (std::int64_t at = style.first; at < file.size();) {
        const auto found = chunk_at(file, style, at);
        if (!found)
            return std::nullopt;
        if (found->id == style.data_id) {
            data_chunk data = data_of(file, style, *found);
            data.valid_bits = valid_bits;
            if (!data.stated_bytes && long_size > 0) {
                data.stated_bytes = long_size;
                data.stated_in_32_bits = false;
            }
            return data;
        }
        if (found->size < 0 || found->size > file.size())
            return std::nullopt;
        if (found->id == "ds64")
            long_size = long_size_of(file, *found);
        if (found->id == "fmt " && style.size_bytes == 4)
            valid_bits = valid_bits_of(file, *found, style.big_endian);
        at = aligned(found->content + found->size, style.alignment);
    }
    return std::nullopt;
}

// Magic, offset of the samples, their size; nothing follows them.
std::optional<data_chunk> find_in_au(const input_file& file, bool big_endian) {
    std::array<std::byte, 12> bytes{};
    if (file.read_at(0, bytes) < bytes.size())
        return std::nullopt;
    data_chunk data;
    data.offset = number_at<std::uint32_t>(bytes, 4, big_endian);
    const auto size = number_at<std::uint32_t>(bytes, 8, big_endian);
    if (size != open_count)
        data.stated_bytes = size;
    return data;
}

// Whether nothing but chunks lies from `at` to the file's end; a missing or odd pad byte is
// forgiven.
bool only_chunks_from(const input_file& file, const chunk_style& style, std::int64_t at) {
    while (at + 1 < file.size()) {
        const auto found = chunk_at(file, style, at);
        if (!found || found->size < 0 || found->size > file.size() - found->content)
            return false;
        at = aligned(found->content + found->size, style.alignment);
    }
    return true;
}

bool only_chunks_after(const input_file& file, std::int64_t end) {
    if (end >= file.size())
        return true;
    const chunk_style* const style = style_of(first_letters(file));
    return style && (only_chunks_from(file, *style, aligned(end, style->alignment)) ||
                     only_chunks_from(file, *style, end));
}

// The size that a 32-bit count has wrapped from, chunks after the samples left out.
std::int64_t unwrapped(const input_file& file, const data_chunk& data, std::int64_t available) {
    const std::int64_t stated = *data.stated_bytes;
    const std::int64_t most = stated + (available - stated) / four_gib * four_gib;
    return only_chunks_after(file, data.offset + most) ? most : available;
}

} // namespace

std::optional<data_chunk> find_data_chunk(const input_file& file) {
    const std::string letters = first_letters(file);
    if (letters == ".snd" || letters == "dns.")
        return find_in_au(file, letters == ".snd");
    const chunk_style* const style = style_of(letters);
    return style ? walk_to_data(file, *style) : std::nullopt;
}

bool looks_like_container(const input_file& file) {
    const std::string letters = first_letters(file);
    constexpr std::array<std::string_view, 4> others{".snd", "dns.", "fLaC", "OggS"};
    return style_of(letters) || std::find(others.begin(), others.end(), letters) != others.end();
}

data_extent extent_of(const input_file& file, const data_chunk& data, std::size_t frame_bytes) {
    const std::int64_t available = std::max<std::int64_t>(file.size() - data.offset, 0);
    data_extent extent{{data.offset, available}, {}, {}};
    const bool left_at_zero = data.stated_bytes == 0 && !only_chunks_after(file, data.offset);
    if (!data.stated_bytes || left_at_zero)
        return extent;
    const std::int64_t stated = *data.stated_bytes;
    const auto frame = static_cast<std::int64_t>(frame_bytes);
    if (stated > available) {
        extent.short_by = fmt::format("the header says {} samples, the file holds {}",
                                      stated / frame, available / frame);
    } else if (only_chunks_after(file, data.offset + stated) || available - stated < frame) {
        extent.range.size = stated;
    } else if (data.stated_in_32_bits && available >= four_gib) {
        extent.range.size = unwrapped(file, data, available);
        extent.overridden =
            fmt::format("{} samples (its 32-bit count has wrapped), the file holds {}",
                        stated / frame, extent.range.size / frame);
    } else {
        throw error{fault::malformed,
                    fmt::format("the header ends the samples here, but {} bytes follow that are "
                                "no chunk of it",
                                available - stated),
                    fmt::format("{}, byte {}", file.name(), data.offset + stated),
                    "correct the size in the header: 0xFFFFFFFF means up to the end"};
    }
    return extent;
}

} // namespace tonewalk
