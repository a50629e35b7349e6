// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <filesystem>
#include <span>
#include <string>
#include <string_view>

namespace tonewalk {

/// A file that appears whole or not at all: written beside its target under a temporary name,
/// synced, renamed without replacing unless `force`. A target that exists and is no regular file
/// (FIFO, device) is written in place; "-" is standard output. Not committed: the destructor
/// removes the temporary. Every failure throws error{unwritable} naming the path and the mend.
class output_file {
public:
    /// Checks that the target can be written (folder there, no file in the way) and opens the
    /// temporary.
    explicit output_file(std::filesystem::path target, bool force = false);
    output_file(output_file&&) noexcept;
    output_file& operator=(output_file&&) noexcept;
    ~output_file();

    void write(std::string_view text); ///< buffered
    void write(std::span<const std::byte> bytes);
    void commit();

    [[nodiscard]] int descriptor() const noexcept {
        return descriptor_;
    } ///< for a library that writes
    [[nodiscard]] bool in_place() const noexcept { return in_place_; } ///< a pipe or device
    [[nodiscard]] bool closed_by_reader() const noexcept {
        return reader_gone_;
    } ///< EPIPE seen: quiet

private:
    void flush();
    std::filesystem::path target_, temporary_;
    std::string buffer_;
    int descriptor_ = -1;
    bool force_ = false, in_place_ = false, committed_ = false, reader_gone_ = false;
};

/// Writes all of it into a descriptor: 0, or the reason (errno).
[[nodiscard]] int write_fully(int descriptor, std::string_view bytes) noexcept;

/// Refuses two outputs that name one file (error{bad_request}); "-" at most once.
void check_distinct_outputs(std::span<const std::filesystem::path>);

/// For a signal handler that leaves at once: removes every temporary of this process.
void remove_temporaries() noexcept;

} // namespace tonewalk
