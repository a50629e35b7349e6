// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <cstdint>
#include <filesystem>
#include <span>
#include <string>

namespace tonewalk {

/// What an error line calls a file: its name, bytes as they are, control characters as "?".
[[nodiscard]] std::string shown(const std::filesystem::path&);

/// Whether a file with contents of its own is there; false too where that cannot be told.
[[nodiscard]] bool is_plain_file(const std::filesystem::path&) noexcept;

/// A file open for reading at any place, by several threads at once.
class input_file {
public:
    /// Throws error{unreadable}.
    explicit input_file(const std::filesystem::path&);
    input_file(input_file&&) noexcept;
    input_file(const input_file&) = delete;
    input_file& operator=(const input_file&) = delete;
    input_file& operator=(input_file&&) = delete;
    ~input_file();

    [[nodiscard]] std::int64_t size() const noexcept { return size_; } ///< when it was opened
    [[nodiscard]] const std::string& name() const noexcept { return name_; }
    [[nodiscard]] int descriptor() const noexcept { return descriptor_; }

    /// Bytes read, fewer than asked only at the file's end. Throws error{unreadable}.
    [[nodiscard]] std::size_t read_at(std::int64_t offset, std::span<std::byte> out) const;
    /// The same; throws error{unreadable} when the file ends before.
    void read_all_at(std::int64_t offset, std::span<std::byte> out) const;

private:
    std::string name_;
    int descriptor_ = -1;
    std::int64_t size_ = 0;
};

/// Bytes [offset, offset + size) of a file: the whole of it, or one member of an archive.
struct byte_range {
    std::int64_t offset = 0, size = 0;
};

/// Text of a byte range of at most 64 MiB. Throws error{malformed} beyond that.
[[nodiscard]] std::string read_text(const input_file&, byte_range, const std::string& name);
/// SHA-512 of a byte range, in hex.
[[nodiscard]] std::string sha512_of(const input_file&, byte_range);

} // namespace tonewalk
