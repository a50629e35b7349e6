// SPDX-License-Identifier: GPL-3.0-or-later
#include <array>
#include <cerrno>
#include <system_error>

#include <fcntl.h>
#include <fmt/format.h>

#include "archive.hpp"
#include "container.hpp"
#include "container_chunks.hpp"
#include "sigmf_recording.hpp"
#include "sources.hpp"
#include "stated.hpp"
#include "tonewalk/base/error.hpp"
#include "tonewalk/recording/verify.hpp"

namespace tonewalk {
namespace {

namespace fs = std::filesystem;

fs::path with_ending(const fs::path& path, const char* ending) {
    fs::path longer = path;
    longer += ending;
    return longer;
}

// The metadata that names this file as its non-conforming data set, if it stands beside it.
std::optional<found_recording> find_by_dataset(const fs::path& path) {
    const std::array<fs::path, 2> candidates{fs::path{path}.replace_extension(".sigmf-meta"),
                                             with_ending(path, ".sigmf-meta")};
    for (const auto& candidate : candidates) {
        if (!is_plain_file(candidate))
            continue;
        found_recording found = find_by_metadata(candidate);
        if (found.metadata.dataset == path.filename().string())
            return found;
    }
    return std::nullopt;
}

// A SigMF recording, whatever part of it the path names; nothing when it is none.
std::optional<found_recording> find_sigmf(const recording_request& request) {
    const fs::path path = request.path;
    const fs::path extension = path.extension();
    if (extension == ".sigmf-meta")
        return find_by_metadata(path);
    if (extension == ".sigmf")
        return find_in_archive(path, request.member);
    if (extension == ".sigmf-data") {
        const fs::path metadata = fs::path{path}.replace_extension(".sigmf-meta");
        if (is_plain_file(metadata))
            return find_by_metadata(metadata);
        if (!request.format)
            throw error{fault::bad_request, "its .sigmf-meta file is missing", shown(path),
                        "put it in the same folder, or give --format and --rate"};
        return std::nullopt;
    }
    if (is_plain_file(path))
        return find_by_dataset(path);
    if (is_plain_file(with_ending(path, ".sigmf-meta")))
        return find_by_metadata(with_ending(path, ".sigmf-meta"));
    if (is_plain_file(with_ending(path, ".sigmf")))
        return find_in_archive(with_ending(path, ".sigmf"), request.member);
    return std::nullopt;
}

// Facts of samples that say nothing of themselves.
stream_facts raw_facts(const recording_request& request) {
    stream_facts facts;
    facts.name = request.path;
    if (!request.format)
        throw error{fault::bad_request, "does not say how its samples are stored", facts.where(),
                    "give --format and --rate, such as --format ci16_le --rate 2.4M"};
    facts.format = *request.format;
    facts.format_name = facts.format.name();
    if (!facts.format.is_float())
        facts.code_bits = static_cast<unsigned>(8 * facts.format.component_bytes());
    facts.sample_rate_hz = rate_to_use(request, std::nullopt, facts.where());
    return facts;
}

std::unique_ptr<block_source> open_raw(const recording_request& request, input_file file) {
    stream_facts facts = raw_facts(request);
    const data_layout layout = lay_out_frames(file.size(), facts.frame_bytes());
    for (const auto& stretch : layout.stretches)
        facts.stretches.push_back(stretch.facts);
    note_odd_tail(facts.notes, layout.odd_bytes, facts.frame_bytes());
    (void)apply(request, {}, facts);
    if (request.verify)
        facts.sha512 = sha512_of(file, {0, file.size()});
    return make_file_source(std::move(facts), std::move(file), {{0}, false});
}

stream_facts pipe_facts(const recording_request& request) {
    stream_facts facts = raw_facts(request);
    if (request.verify)
        throw error{fault::bad_request, "a pipe cannot be verified before it is measured",
                    facts.where(), "leave --verify out, or give a file"};
    facts.seekable = false;
    facts.stretches.emplace_back();
    (void)apply(request, {}, facts);
    return facts;
}

// A FIFO or a device; opened without waiting for a writer, which claim then does.
std::unique_ptr<block_source> open_named_pipe(const recording_request& request) {
    stream_facts facts = pipe_facts(request);
    const int descriptor = ::open(request.path.c_str(), O_RDONLY | O_CLOEXEC | O_NONBLOCK);
    if (descriptor < 0)
        throw error{fault::unreadable,
                    fmt::format("cannot be read ({})", std::generic_category().message(errno)),
                    shown(request.path), "check the name and who may read it"};
    return make_pipe_source(std::move(facts), descriptor, true);
}

bool is_container(const recording_request& request, const input_file& file) {
    // A stated format means raw samples, unless the file certainly is something else.
    return looks_like_container(file) || (!request.format && named_like_container(request.path));
}

std::unique_ptr<block_source> open_file(const recording_request& request) {
    input_file file{request.path};
    if (const std::string how = compression_of(file); !how.empty() && !request.format)
        throw error{fault::unsupported, fmt::format("is compressed ({})", how), file.name(),
                    "unpack it first"};
    const bool container = is_container(request, file);
    if (container && request.format)
        throw error{fault::bad_request, "says its format itself", file.name(),
                    "leave --format out"};
    return container ? open_container(request, std::move(file))
                     : open_raw(request, std::move(file));
}

void refuse_collection(const fs::path& path) {
    if (path.extension() == ".sigmf-collection")
        throw error{fault::unsupported, "is a collection, which holds no samples itself",
                    shown(path), "give one of the recordings that it lists"};
}

void check_member(const recording_request& request) {
    if (!request.member.empty() && fs::path{request.path}.extension() != ".sigmf" &&
        !is_plain_file(with_ending(request.path, ".sigmf")))
        throw error{fault::bad_request, "is no archive, so it has no members", shown(request.path),
                    "leave --member out"};
}

} // namespace

std::unique_ptr<block_source> open_recording(const recording_request& request) {
    if (request.path == "-")
        return make_pipe_source(pipe_facts(request), request.pipe_descriptor, false);
    refuse_collection(request.path);
    check_member(request);
    if (auto found = find_sigmf(request))
        return open_sigmf(request, std::move(*found));
    std::error_code unknown; // opening it says why
    const fs::file_status status = fs::status(request.path, unknown);
    if (fs::is_directory(status))
        throw error{fault::unreadable, "is a folder", shown(request.path),
                    "give a recording inside it"};
    if (fs::exists(status) && !fs::is_regular_file(status))
        return open_named_pipe(request);
    return open_file(request);
}

data_hash hash_data(const recording_request& request) {
    if (const auto found = find_sigmf(request))
        return hash_of(*found);
    const input_file file{request.path};
    return {sha512_of(file, {0, file.size()}), {}};
}

} // namespace tonewalk
