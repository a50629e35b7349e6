// SPDX-License-Identifier: GPL-3.0-or-later
#include "input_file.hpp"

#include <algorithm>
#include <cerrno>
#include <system_error>
#include <utility>
#include <vector>

#include <fcntl.h>
#include <fmt/format.h>
#include <sys/stat.h>
#include <unistd.h>

#include "tonewalk/base/error.hpp"
#include "tonewalk/base/text.hpp"
#include "tonewalk/recording/sha512.hpp"

namespace tonewalk {
namespace {

[[noreturn]] void throw_unreadable(const std::string& name, int code) {
    throw error{fault::unreadable,
                fmt::format("cannot be read ({})", std::generic_category().message(code)), name,
                "check the name and who may read it"};
}

} // namespace

std::string shown(const std::filesystem::path& path) {
    return one_line(path.string());
}

bool is_plain_file(const std::filesystem::path& path) noexcept {
    std::error_code unknown;
    return std::filesystem::is_regular_file(path, unknown);
}

input_file::input_file(const std::filesystem::path& path)
    : name_{shown(path)}, descriptor_{::open(path.c_str(), O_RDONLY | O_CLOEXEC)} {
    if (descriptor_ < 0)
        throw_unreadable(name_, errno);
    struct stat facts {};
    if (::fstat(descriptor_, &facts) != 0) {
        const int code = errno;
        ::close(descriptor_);
        throw_unreadable(name_, code);
    }
    size_ = facts.st_size;
}

input_file::input_file(input_file&& other) noexcept
    : name_{std::move(other.name_)},
      descriptor_{std::exchange(other.descriptor_, -1)}, size_{other.size_} {}

input_file::~input_file() {
    if (descriptor_ >= 0)
        ::close(descriptor_);
}

std::size_t input_file::read_at(std::int64_t offset, std::span<std::byte> out) const {
    std::size_t done = 0;
    while (done < out.size()) {
        const ::ssize_t part = ::pread(descriptor_, out.data() + done, out.size() - done,
                                       offset + static_cast<std::int64_t>(done));
        if (part == 0)
            break;
        if (part > 0)
            done += static_cast<std::size_t>(part);
        else if (errno != EINTR)
            throw_unreadable(name_, errno);
    }
    return done;
}

void input_file::read_all_at(std::int64_t offset, std::span<std::byte> out) const {
    const auto end = offset + static_cast<std::int64_t>(read_at(offset, out));
    if (end < offset + static_cast<std::int64_t>(out.size()))
        throw error{fault::unreadable,
                    fmt::format("ends here although it held {} bytes when it was opened", size_),
                    fmt::format("{}, byte {}", name_, end),
                    "measure it when nothing else writes to it"};
}

std::string read_text(const input_file& file, byte_range range, const std::string& name) {
    constexpr std::int64_t longest = 64 << 20;
    if (range.size > longest)
        throw error{fault::malformed,
                    fmt::format("is {} bytes long, too long for metadata", range.size), name,
                    "give the recording's .sigmf-meta file"};
    std::string text(static_cast<std::size_t>(range.size), '\0');
    file.read_all_at(range.offset, std::as_writable_bytes(std::span{text}));
    return text;
}

std::string sha512_of(const input_file& file, byte_range range) {
    sha512_hash hash;
    std::vector<std::byte> part(1 << 20);
    for (std::int64_t done = 0; done < range.size;) {
        const auto size = std::min<std::int64_t>(std::ssize(part), range.size - done);
        const auto bytes = std::span{part}.first(static_cast<std::size_t>(size));
        file.read_all_at(range.offset + done, bytes);
        hash.add(bytes);
        done += size;
    }
    return hash.finish();
}

} // namespace tonewalk
