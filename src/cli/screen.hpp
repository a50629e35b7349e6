// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

namespace tonewalk::cli {

/// Of the terminal behind a descriptor, at least 40; 80 where there is none.
[[nodiscard]] int screen_columns(int descriptor);

/// Only on a terminal that can, and only where NO_COLOR is not set to anything.
[[nodiscard]] bool shows_colour(int descriptor);

} // namespace tonewalk::cli
