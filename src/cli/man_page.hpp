// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <string>

#include "option_tree.hpp"

namespace tonewalk::cli {

/// The manual page as roff source, man macros. Options that several jobs share, to the letter, are
/// told once; each job names them.
[[nodiscard]] std::string man_page(const option_tree&);

} // namespace tonewalk::cli
