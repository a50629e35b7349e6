// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <chrono>
#include <optional>
#include <string>
#include <string_view>

namespace tonewalk {

using utc_time = std::chrono::sys_time<std::chrono::nanoseconds>;

/// RFC 3339, "Z" or an offset, fraction to any length (kept to the nanosecond), second 60 allowed
/// (counted as the next minute's first). Nothing where the text is not such a time.
[[nodiscard]] std::optional<utc_time> parse_utc(std::string_view text);

/// "2026-05-04T09:30:00.123Z": `decimals` digits of the second, 0 to 9, truncated.
[[nodiscard]] std::string format_utc(utc_time, int decimals = 3);

/// `start` moved by `seconds`, rounded to the nanosecond.
[[nodiscard]] utc_time moved_by(utc_time start, double seconds);

} // namespace tonewalk
