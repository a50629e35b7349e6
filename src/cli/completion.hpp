// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <string>
#include <string_view>
#include <vector>

#include "option_tree.hpp"

namespace tonewalk::cli {

inline const std::vector<std::string_view> completion_shells{"bash", "zsh", "fish"};

/// A script that lets the shell complete jobs, options, choices and file names.
/// `shell` is one of completion_shells.
[[nodiscard]] std::string completion_script(const option_tree&, std::string_view shell);

} // namespace tonewalk::cli
