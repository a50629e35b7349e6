// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <filesystem>
#include <string>
#include <string_view>

#include "tonewalk/base/run_control.hpp"
#include "tonewalk/scene/scene.hpp"

namespace tonewalk {

/// Reads scene.toml; every key in docs/jobs/make.md. Throws error{unreadable, malformed} naming
/// file, line, key and the mend.
[[nodiscard]] scene read_scene(const std::filesystem::path&);
[[nodiscard]] scene parse_scene(std::string_view toml, const std::string& name);

struct made_recording {
    std::filesystem::path data, metadata, truth;
    sample_index samples = 0;
    std::string sha512;   ///< of the data
    bool stopped = false; ///< by the run control: nothing was written
};
/// Writes BASE.sigmf-data, BASE.sigmf-meta and BASE.truth.json, all whole or none of them. Throws
/// error{unwritable}.
made_recording make_recording(const scene&, const std::filesystem::path& base, bool force = false,
                              const run_control& = {});

} // namespace tonewalk
