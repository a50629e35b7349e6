// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/base/text.hpp"

#include <algorithm>
#include <array>
#include <cerrno>
#include <charconv>
#include <cmath>
#include <cstdint>
#include <cstdio>
#include <memory>
#include <system_error>

#include <fmt/core.h>

#include "tonewalk/base/error.hpp"

namespace tonewalk {
namespace {

constexpr std::size_t most_text_bytes = std::size_t{64} << 20;
constexpr std::string_view white_space = " \t\r\n\f\v";

/// Length of the UTF-8 sequence that starts here; 0 where none does.
std::size_t sequence_length(std::string_view text) noexcept {
    const auto byte = [&](std::size_t i) { return static_cast<unsigned char>(text[i]); };
    const unsigned first = byte(0);
    const std::size_t length = first < 0x80   ? 1U
                               : first < 0xC2 ? 0U
                               : first < 0xE0 ? 2U
                               : first < 0xF0 ? 3U
                               : first < 0xF5 ? 4U
                                              : 0U;
    if (length > text.size())
        return 0;
    for (std::size_t i = 1; i < length; ++i)
        if ((byte(i) & 0xC0U) != 0x80U)
            return 0;
    if (length < 3)
        return length;
    // Overlong forms, surrogates, and what lies above U+10FFFF.
    const unsigned second = byte(1);
    const bool wrong = (first == 0xE0 && second < 0xA0) || (first == 0xED && second > 0x9F) ||
                       (first == 0xF0 && second < 0x90) || (first == 0xF4 && second > 0x8F);
    return wrong ? 0 : length;
}

[[noreturn]] void throw_unreadable(const std::filesystem::path& path, int code) {
    throw error{fault::unreadable, "cannot be read (" + std::generic_category().message(code) + ")",
                valid_utf8(path.string()), "check the name and who may read it"};
}

} // namespace

std::string_view trimmed(std::string_view text) noexcept {
    const std::size_t first = text.find_first_not_of(white_space);
    if (first == text.npos)
        return {};
    return text.substr(first, text.find_last_not_of(white_space) - first + 1);
}

std::string lower_case(std::string_view text) {
    std::string lowered{text};
    for (char& letter : lowered)
        if (letter >= 'A' && letter <= 'Z')
            letter = static_cast<char>(letter - 'A' + 'a');
    return lowered;
}

std::optional<double> parse_plain_number(std::string_view text) noexcept {
    if (text.starts_with('+') && !text.starts_with("+-"))
        text.remove_prefix(1);
    double value = 0.0;
    const auto [end, failure] = std::from_chars(text.data(), text.data() + text.size(), value);
    if (failure != std::errc{} || end != text.data() + text.size() || !std::isfinite(value))
        return std::nullopt;
    return value;
}

bool has_decimal_comma(std::string_view text) {
    if (std::count(text.begin(), text.end(), ',') != 1)
        return false;
    std::string with_point{text};
    with_point[with_point.find(',')] = '.';
    return parse_plain_number(with_point).has_value();
}

std::string one_line(std::string text) {
    for (char& letter : text)
        if (static_cast<unsigned char>(letter) < 0x20 || letter == 0x7F)
            letter = '?';
    return text;
}

std::string in_quotes(std::string_view text) {
    constexpr std::size_t longest = 80;
    return '"' + one_line(valid_utf8(text.substr(0, longest))) +
           (text.size() > longest ? "...\"" : "\"");
}

std::string valid_utf8(std::string_view text) {
    std::string valid;
    valid.reserve(text.size());
    while (!text.empty()) {
        const std::size_t length = sequence_length(text);
        valid += length > 0 ? text.substr(0, length) : std::string_view{"\xEF\xBF\xBD"};
        text.remove_prefix(std::max<std::size_t>(length, 1));
    }
    return valid;
}

std::string json_string(std::string_view text) {
    std::string quoted = "\"";
    for (const char letter : valid_utf8(text)) {
        if (letter == '"' || letter == '\\')
            quoted += '\\';
        if (static_cast<unsigned char>(letter) < 0x20)
            quoted += fmt::format("\\u{:04x}", static_cast<unsigned>(letter));
        else
            quoted += letter;
    }
    return quoted + '"';
}

std::size_t width_of(std::string_view text) noexcept {
    return static_cast<std::size_t>(std::count_if(text.begin(), text.end(), [](char letter) {
        return (static_cast<unsigned char>(letter) & 0xC0U) != 0x80U;
    }));
}

std::vector<std::string> wrapped_lines(std::string_view text, std::size_t columns,
                                       std::size_t hanging) {
    std::vector<std::string> lines;
    while (!(text = trimmed(text)).empty()) {
        const std::string_view word = text.substr(0, text.find(' '));
        const std::size_t room = columns - (lines.size() > 1 ? std::min(columns, hanging) : 0);
        if (!lines.empty() && width_of(lines.back()) + 1 + width_of(word) <= room) {
            lines.back() += ' ';
            lines.back() += word;
        } else {
            lines.emplace_back(word);
        }
        text.remove_prefix(word.size());
    }
    return lines;
}

void refuse_utf16(std::string_view text, std::string_view where) {
    if (text.starts_with("\xFF\xFE") || text.starts_with("\xFE\xFF"))
        throw error{fault::malformed, "is text in UTF-16", where, "save it as UTF-8"};
}

std::string read_text_file(const std::filesystem::path& path) {
    std::error_code ignored;
    if (std::filesystem::is_directory(path, ignored))
        throw_unreadable(path, EISDIR);
    const std::unique_ptr<std::FILE, int (*)(std::FILE*)> file{std::fopen(path.c_str(), "rb"),
                                                               &std::fclose};
    if (!file)
        throw_unreadable(path, errno);
    std::string text;
    std::array<char, 65536> part;
    while (const std::size_t read = std::fread(part.data(), 1, part.size(), file.get())) {
        if (text.append(part.data(), read).size() > most_text_bytes)
            throw error{fault::malformed, "is too long for a text file", valid_utf8(path.string()),
                        "check that it is the right file"};
    }
    if (std::ferror(file.get()) != 0)
        throw_unreadable(path, errno);
    refuse_utf16(text, valid_utf8(path.string()));
    constexpr std::string_view byte_order_mark = "\xEF\xBB\xBF";
    if (text.starts_with(byte_order_mark))
        text.erase(0, byte_order_mark.size());
    return text;
}

} // namespace tonewalk
