// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <filesystem>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

namespace tonewalk {

/// Small text helpers; all work the same in every locale.

/// Without the white space at both ends.
[[nodiscard]] std::string_view trimmed(std::string_view text) noexcept;

/// ASCII letters made small.
[[nodiscard]] std::string lower_case(std::string_view text);

/// A finite decimal number that fills the whole text ("12", "-3.5e2", "+1"), else nothing.
[[nodiscard]] std::optional<double> parse_plain_number(std::string_view text) noexcept;

/// Whether a comma stands where a decimal point would make the text a number ("12,5").
[[nodiscard]] bool has_decimal_comma(std::string_view text);

/// Control characters made "?": stays one line and leaves a terminal alone.
[[nodiscard]] std::string one_line(std::string text);

/// In double quotes, fit for one line: control characters become "?", long text is cut.
[[nodiscard]] std::string in_quotes(std::string_view text);

/// Well-formed UTF-8: every byte that is not part of it becomes U+FFFD.
[[nodiscard]] std::string valid_utf8(std::string_view text);

/// As JSON writes it: well-formed UTF-8 in double quotes, what must be escaped as \uXXXX.
[[nodiscard]] std::string json_string(std::string_view text);

/// Characters, not bytes.
[[nodiscard]] std::size_t width_of(std::string_view text) noexcept;

/// Broken between words into lines of at most `columns` characters, those after the first of
/// `hanging` fewer; long words stay whole. Runs of spaces become one. No words: no lines.
[[nodiscard]] std::vector<std::string> wrapped_lines(std::string_view text, std::size_t columns,
                                                     std::size_t hanging = 0);

/// Throws error{malformed} for what begins as text in UTF-16 does.
void refuse_utf16(std::string_view text, std::string_view where);

/// The whole of a small text file, without a UTF-8 byte-order mark. Throws error{unreadable};
/// error{malformed} for UTF-16 and for what is longer than text ever is.
[[nodiscard]] std::string read_text_file(const std::filesystem::path&);

} // namespace tonewalk
