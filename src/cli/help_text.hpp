// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <string>

#include "option_tree.hpp"

namespace tonewalk::cli {

/// What --help prints, for a screen of so many columns (from 40 up everything fits; more than 80
/// are not used).
[[nodiscard]] std::string help_text(const option_tree&, int columns);
[[nodiscard]] std::string help_text(const command_facts& job, int columns);

} // namespace tonewalk::cli
