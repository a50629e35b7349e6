// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>

namespace tonewalk {

inline constexpr std::size_t lanes = 8; ///< partial sums an output, whatever the instruction set
inline constexpr double stop_in_widths = 0.75; ///< off the carrier, where the channel filter stops

} // namespace tonewalk
