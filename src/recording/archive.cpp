// SPDX-License-Identifier: GPL-3.0-or-later
#include "archive.hpp"

#include <algorithm>
#include <array>
#include <memory>
#include <string_view>

#include <archive.h>
#include <archive_entry.h>
#include <fmt/format.h>
#include <unistd.h>

#include "tonewalk/base/error.hpp"
#include "tonewalk/base/text.hpp"

namespace tonewalk {
namespace {

struct archive_closer {
    void operator()(::archive* reader) const noexcept { ::archive_read_free(reader); }
};
using archive_handle = std::unique_ptr<::archive, archive_closer>;

[[noreturn]] void throw_broken(const input_file& file, ::archive* reader) {
    const char* const reason = ::archive_error_string(reader);
    throw error{
        fault::malformed,
        fmt::format("is no whole tar archive ({})", reason ? shown(reason) : "no reason given"),
        fmt::format("{}, byte {}", file.name(), ::archive_filter_bytes(reader, 0)),
        "copy the archive again"};
}

archive_handle open_tar(const input_file& file) {
    constexpr std::size_t block = 65536;
    archive_handle reader{::archive_read_new()};
    if (!reader)
        throw std::bad_alloc{};
    ::archive_read_support_format_tar(reader.get());
    ::lseek(file.descriptor(), 0, SEEK_SET);
    if (::archive_read_open_fd(reader.get(), file.descriptor(), block) != ARCHIVE_OK)
        throw_broken(file, reader.get());
    return reader;
}

bool is_rooted_or_climbs(std::string_view name) {
    if (name.empty() || name.front() == '/')
        return true;
    for (std::size_t at = 0; at <= name.size();) {
        const std::size_t end = std::min(name.find('/', at), name.size());
        if (name.substr(at, end - at) == "..")
            return true;
        at = end + 1;
    }
    return false;
}

std::string refusal_of(::archive_entry* entry, std::string_view name) {
    if (::archive_entry_hardlink(entry) || ::archive_entry_hardlink_w(entry) ||
        ::archive_entry_symlink(entry) || ::archive_entry_symlink_w(entry) ||
        ::archive_entry_filetype(entry) == AE_IFLNK)
        return "is a link";
    if (::archive_entry_filetype(entry) != AE_IFREG)
        return "is no file";
    if (is_rooted_or_climbs(name))
        return "has a name that leads out of the archive";
    if (::archive_entry_sparse_count(entry) > 0)
        return "is stored with holes";
    return {};
}

std::string name_of(::archive_entry* entry) {
    // The locale's form is missing for names that the C locale cannot show.
    if (const char* const name = ::archive_entry_pathname(entry))
        return name;
    const char* const name = ::archive_entry_pathname_utf8(entry);
    return name ? name : "";
}

archive_member member_of(const input_file& file, ::archive* reader, ::archive_entry* entry) {
    archive_member member;
    member.name = name_of(entry);
    member.range = {::archive_filter_bytes(reader, 0), ::archive_entry_size(entry)};
    member.refusal = refusal_of(entry, member.name);
    if (member.refusal.empty() && member.range.size > file.size() - member.range.offset)
        throw error{
            fault::malformed,
            fmt::format("the archive ends before its member {} does", in_quotes(member.name)),
            fmt::format("{}, byte {}", file.name(), file.size()), "copy the archive again"};
    return member;
}

} // namespace

std::vector<archive_member> list_members(const input_file& file) {
    if (const std::string how = compression_of(file); !how.empty())
        throw error{fault::unsupported, fmt::format("is compressed ({})", how), file.name(),
                    "unpack it first: samples are read in place from a plain tar archive"};
    const archive_handle reader = open_tar(file);
    std::vector<archive_member> members;
    ::archive_entry* entry = nullptr;
    while (true) {
        const int status = ::archive_read_next_header(reader.get(), &entry);
        if (status == ARCHIVE_EOF)
            return members;
        if (status != ARCHIVE_OK && status != ARCHIVE_WARN)
            throw_broken(file, reader.get());
        members.push_back(member_of(file, reader.get(), entry));
    }
}

std::string compression_of(const input_file& file) {
    struct kind {
        std::string_view magic, name;
    };
    using namespace std::string_view_literals;
    static constexpr std::array<kind, 8> kinds{{{"\x1F\x8B"sv, "gzip"},
                                                {"\x1F\x9D"sv, "compress"},
                                                {"BZh"sv, "bzip2"},
                                                {"\xFD"
                                                 "7zXZ\0"sv,
                                                 "xz"},
                                                {"\x28\xB5\x2F\xFD"sv, "zstd"},
                                                {"\x04\x22\x4D\x18"sv, "lz4"},
                                                {"LZIP"sv, "lzip"},
                                                {"PK\x03\x04"sv, "zip"}}};
    std::array<char, 8> start{};
    const std::size_t read = file.read_at(0, std::as_writable_bytes(std::span{start}));
    const std::string_view begin{start.data(), read};
    for (const auto& kind : kinds)
        if (begin.substr(0, kind.magic.size()) == kind.magic)
            return std::string{kind.name};
    return {};
}

} // namespace tonewalk
