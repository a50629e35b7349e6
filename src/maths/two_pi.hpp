// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <numbers>

namespace tonewalk {

inline constexpr double two_pi = 2.0 * std::numbers::pi;

} // namespace tonewalk
