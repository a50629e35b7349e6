// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <functional>
#include <string>
#include <string_view>

#include "tonewalk/base/error.hpp"
#include "tonewalk/scene/scene.hpp"

namespace tonewalk {

/// Makes the error for one value: `table` as in "carrier[1].tone[0]" (counted from 0, empty for
/// [recording]'s), `key` as in scene.toml.
using scene_complaint = std::function<error(const std::string& table, std::string_view key,
                                            std::string_view what, std::string_view mend)>;

/// Throws the complaint about the first value that cannot be made.
void check_scene(const scene&, const scene_complaint&);

} // namespace tonewalk
