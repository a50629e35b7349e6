// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <optional>
#include <string_view>
#include <variant>

#include "tonewalk/base/time.hpp"

namespace tonewalk {

/// Values as people type them. All throw error{bad_request} whose line names `option`, shows what
/// was typed, and gives a right example. Decimal point in every locale; infinities and NaN are
/// refused.

/// "145.2M", "12.5k", "1000", "1k Hz", "2.4MHz". A sign is kept.
[[nodiscard]] double parse_hz(std::string_view text, std::string_view option);

/// A frequency together with whether a sign was typed: +3.2M and -5k are offsets, 145M is absolute.
struct signed_hz {
    double hz = 0.0;
    bool is_offset = false;
};
[[nodiscard]] signed_hz parse_signed_hz(std::string_view text, std::string_view option);

/// "1.5", "1.5s", "200ms", "3min", "2h", "01:02:03.5", "02:03". A bare "m" is refused (metres or
/// minutes?).
[[nodiscard]] double parse_seconds(std::string_view text, std::string_view option);

/// A moment inside a recording: seconds from its first sample, or a UTC time.
using moment = std::variant<double, utc_time>;
[[nodiscard]] moment parse_moment(std::string_view text, std::string_view option);

[[nodiscard]] double parse_db(std::string_view text, std::string_view option); ///< "-3", "-3dB"
[[nodiscard]] long parse_whole(std::string_view text, std::string_view option, long lowest,
                               long highest);

/// "145.2 MHz", "1 kHz", "437.5 Hz": engineering prefix, up to `digits` significant digits, no
/// trailing zeros.
[[nodiscard]] std::string format_hz(double hz, int digits = 12);

/// What to type again: "+3.2M", "-12500", "145.2M".
[[nodiscard]] std::string format_option_hz(double hz, bool as_offset);

/// As people type a time: "200ms", "1.5s".
[[nodiscard]] std::string format_option_seconds(double seconds);

} // namespace tonewalk
