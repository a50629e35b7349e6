// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <filesystem>
#include <memory>

#include "input_file.hpp"
#include "tonewalk/recording/sigmf_metadata.hpp"
#include "tonewalk/recording/stream.hpp"
#include "tonewalk/recording/verify.hpp"

namespace tonewalk {

/// A SigMF recording found: its metadata, and the file that holds its data set.
struct found_recording {
    sigmf_metadata metadata;
    std::string metadata_name; ///< for error lines
    std::string data_name;
    input_file file;
    byte_range data; ///< in `file`
};

/// By its .sigmf-meta file.
[[nodiscard]] found_recording find_by_metadata(const std::filesystem::path&);
/// In a .sigmf archive: the recording of that name, or the only one. Throws error{bad_request}
/// listing them.
[[nodiscard]] found_recording find_in_archive(const std::filesystem::path&,
                                              const std::string& member);

[[nodiscard]] data_hash hash_of(const found_recording&);

[[nodiscard]] std::unique_ptr<block_source> open_sigmf(const recording_request&, found_recording);

} // namespace tonewalk
