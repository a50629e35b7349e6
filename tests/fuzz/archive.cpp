// SPDX-License-Identifier: GPL-3.0-or-later
// A .sigmf archive: what may be used of it lies in it, and is read.
#include "archive.hpp"

#include "memory_file.hpp"
#include "sigmf_recording.hpp"
#include "targets.hpp"
#include "walk.hpp"

namespace tonewalk::fuzz {
namespace {

void check_range(byte_range range, std::int64_t file_bytes) {
    promise(range.offset >= 0 && range.size >= 0 && range.size <= file_bytes - range.offset,
            "a member that leaves the archive");
}

void check_name(const std::string& name) {
    promise(!name.starts_with('/'), "a rooted name");
    promise(('/' + name + '/').find("/../") == std::string::npos, "a climbing name");
}

} // namespace

bool archive(input bytes) {
    const memory_file memory{bytes};
    return accepted([&] {
        for (const archive_member& member : list_members(input_file{memory.path()})) {
            if (!member.refusal.empty())
                continue;
            check_range(member.range, static_cast<std::int64_t>(bytes.size()));
            check_name(member.name);
        }
        found_recording found = find_in_archive(memory.path(), {});
        check_range(found.data, static_cast<std::int64_t>(bytes.size()));
        walk(*open_sigmf(memory.request(), std::move(found)));
    });
}

} // namespace tonewalk::fuzz
