// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <span>
#include <string>
#include <string_view>

namespace tonewalk {

/// The name that was probably meant: fewest slips (a letter wrong, missing, added, or two
/// exchanged; large and small letters alike), at most a third of the longer name's letters; empty
/// where none is near.
[[nodiscard]] std::string near_name(std::string_view typed,
                                    std::span<const std::string_view> names);
[[nodiscard]] std::string near_name(std::string_view typed, std::span<const std::string> names);

/// The mend of an error line: "did you mean rate_hz?", or "known are: a, b, c".
[[nodiscard]] std::string name_hint(std::string_view typed,
                                    std::span<const std::string_view> names);

} // namespace tonewalk
