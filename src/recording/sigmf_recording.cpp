// SPDX-License-Identifier: GPL-3.0-or-later
#include "sigmf_recording.hpp"

#include <algorithm>
#include <map>
#include <utility>

#include <fmt/format.h>
#include <fmt/ranges.h>

#include "archive.hpp"
#include "sources.hpp"
#include "stated.hpp"
#include "tonewalk/base/error.hpp"
#include "tonewalk/base/text.hpp"

namespace tonewalk {
namespace {

constexpr std::string_view metadata_ending = ".sigmf-meta";
constexpr std::string_view data_ending = ".sigmf-data";

bool ends_with_one(const std::string& name) {
    return name.ends_with(metadata_ending) || name.ends_with(data_ending);
}

// "walk" of "walk.sigmf-meta".
std::string base_of(const std::string& name) {
    return ends_with_one(name) ? name.substr(0, name.size() - metadata_ending.size()) : name;
}

// The data set's name: beside the metadata, and in the same folder.
std::string data_name_of(const sigmf_metadata& metadata, const std::string& metadata_name) {
    if (metadata.dataset.empty())
        return base_of(metadata_name) + std::string{data_ending};
    const auto folder = metadata_name.rfind('/');
    return metadata_name.substr(0, folder == std::string::npos ? 0 : folder + 1) + metadata.dataset;
}

// SigMF lets a data set that is there count for more than metadata_only.
[[noreturn]] void throw_without_data(const sigmf_metadata& metadata, const std::string& where,
                                     std::string_view what, std::string_view mend) {
    if (metadata.metadata_only)
        throw error{fault::malformed, "holds metadata only, no samples", where,
                    "give the recording that it was made from"};
    throw error{fault::unreadable, what, where, mend};
}

// One recording in an archive; members are named without the ending.
using recordings_by_base = std::map<std::string, const archive_member*>;

recordings_by_base recordings_in(const std::vector<archive_member>& members,
                                 const std::string& archive) {
    recordings_by_base recordings;
    for (const auto& member : members) {
        if (!member.name.ends_with(metadata_ending))
            continue;
        if (!recordings.emplace(base_of(member.name), &member).second)
            throw error{fault::malformed, fmt::format("holds {} twice", in_quotes(member.name)),
                        archive, "keep one of them"};
    }
    if (recordings.empty())
        throw error{fault::malformed, "holds no recording (no member ends in .sigmf-meta)", archive,
                    "check that it is the right archive"};
    return recordings;
}

const archive_member& chosen(const recordings_by_base& recordings, const std::string& name,
                             const std::string& archive) {
    if (name.empty() && recordings.size() == 1)
        return *recordings.begin()->second;
    const std::string base = base_of(name);
    const archive_member* match = nullptr;
    std::vector<std::string> known;
    for (const auto& [path, member] : recordings) {
        known.push_back(shown(path));
        if (path == base)
            match = member;
    }
    if (match)
        return *match;
    throw error{fault::bad_request,
                name.empty() ? fmt::format("holds {} recordings", recordings.size())
                             : fmt::format("holds no recording {}", in_quotes(name)),
                archive, fmt::format("give --member with one of: {}", fmt::join(known, ", "))};
}

const archive_member& usable(const archive_member& member, const std::string& archive) {
    if (!member.refusal.empty())
        throw error{fault::malformed, member.refusal,
                    fmt::format("{}, member {}", archive, in_quotes(member.name)),
                    "pack the recording again as plain files"};
    return member;
}

const archive_member* find_member(const std::vector<archive_member>& members,
                                  const std::string& name, const std::string& archive) {
    const archive_member* found = nullptr;
    for (const auto& member : members) {
        if (member.name != name)
            continue;
        if (found)
            throw error{fault::malformed, fmt::format("holds {} twice", in_quotes(name)), archive,
                        "keep one of them"};
        found = &member;
    }
    return found;
}

sample_format format_to_use(const recording_request& request, const found_recording& found,
                            stated_facts& stated) {
    const sigmf_metadata& metadata = found.metadata;
    if (!request.format && !metadata.format)
        throw error{fault::malformed,
                    fmt::format("{} is no datatype of SigMF", in_quotes(metadata.datatype)),
                    found.metadata_name + ", global, core:datatype",
                    "correct it, or give --format, such as --format ci16_le"};
    if (request.format && request.format != metadata.format)
        stated.overridden.push_back(fmt::format(
            "format {}, --format {}", in_quotes(metadata.datatype), request.format->name()));
    return request.format ? *request.format : *metadata.format;
}

// The hash as found; refuses data that the stated one does not fit.
std::string verified_hash(const found_recording& found) {
    data_hash hash = hash_of(found);
    if (hash.differs())
        throw error{
            fault::malformed,
            fmt::format("SHA-512 begins {:.16}, the metadata says {:.16}", hash.found, hash.stated),
            found.data_name, "copy the recording again: its data have changed"};
    return std::move(hash.found);
}

} // namespace

found_recording find_by_metadata(const std::filesystem::path& path) {
    const input_file text{path};
    const std::string name = shown(path);
    sigmf_metadata metadata = parse_sigmf_metadata(read_text(text, {0, text.size()}, name), name);
    const std::filesystem::path data = data_name_of(metadata, path.string());
    if (!is_plain_file(data)) {
        std::error_code unknown;
        throw_without_data(
            metadata, name,
            fmt::format("its data file {} is {}", in_quotes(data.filename().string()),
                        std::filesystem::exists(data, unknown) ? "no plain file" : "missing"),
            "put it in the same folder");
    }
    input_file file{data};
    const byte_range whole{0, file.size()};
    return {std::move(metadata), name, shown(data), std::move(file), whole};
}

found_recording find_in_archive(const std::filesystem::path& path, const std::string& member_name) {
    input_file file{path};
    const std::vector<archive_member> members = list_members(file);
    const std::string archive = file.name();
    const archive_member& text =
        usable(chosen(recordings_in(members, archive), member_name, archive), archive);
    const std::string name = fmt::format("{}, member {}", archive, in_quotes(text.name));
    sigmf_metadata metadata = parse_sigmf_metadata(read_text(file, text.range, name), name);
    const std::string data_name = data_name_of(metadata, text.name);
    const archive_member* const data = find_member(members, data_name, archive);
    if (!data)
        throw_without_data(metadata, name,
                           fmt::format("the archive has no file {}", in_quotes(data_name)),
                           "pack the recording again with its data");
    const byte_range range = usable(*data, archive).range;
    return {std::move(metadata), name, fmt::format("{}, member {}", archive, in_quotes(data_name)),
            std::move(file), range};
}

data_hash hash_of(const found_recording& found) {
    return {sha512_of(found.file, found.data), found.metadata.sha512};
}

std::unique_ptr<block_source> open_sigmf(const recording_request& request, found_recording found) {
    stated_facts stated{found.metadata.sample_rate_hz, {}};
    stream_facts facts;
    facts.name = request.path;
    facts.format = format_to_use(request, found, stated);
    facts.format_name = facts.format.name();
    if (!facts.format.is_float())
        facts.code_bits = static_cast<unsigned>(8 * facts.format.component_bytes());
    facts.lanes = found.metadata.lanes;
    facts.sample_rate_hz = rate_to_use(request, stated.rate_hz, found.metadata_name);
    const std::size_t frame = facts.frame_bytes();
    const data_layout layout = lay_out_segments(found.metadata, found.data.size, frame,
                                                facts.sample_rate_hz, found.metadata_name);
    facts.start_utc = layout.start_utc;
    for (const auto& stretch : layout.stretches)
        facts.stretches.push_back(stretch.facts);
    note_odd_tail(facts.notes, layout.odd_bytes, frame);
    frame_storage storage;
    for (const std::size_t origin : apply(request, std::move(stated), facts))
        storage.origins.push_back(found.data.offset + layout.stretches[origin].header_bytes);
    note_missing_samples(facts);
    if (request.verify)
        facts.sha512 = verified_hash(found);
    return make_file_source(std::move(facts), std::move(found.file), std::move(storage));
}

} // namespace tonewalk
