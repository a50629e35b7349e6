// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <string>
#include <string_view>
#include <vector>

namespace tonewalk {

enum class ink { plain, strong, faint, alarm };

/// Puts text on a screen of a given width.
class text_layout {
public:
    text_layout(int columns, bool colour)
        : columns_{static_cast<std::size_t>(columns < 20 ? 20 : columns)}, colour_{colour} {}

    /// Broken between words, later lines indented further; long words stay whole. Ends with a line
    /// feed.
    [[nodiscard]] std::string paragraph(std::string_view text, std::size_t indent = 0,
                                        std::size_t hanging = 0) const;
    [[nodiscard]] std::string coloured(std::string_view text, ink) const;

    /// "label   value" lines, values below each other; a value that does not fit moves to its own
    /// line.
    struct pair {
        std::string label, value;
    };
    [[nodiscard]] std::string pairs(const std::vector<pair>&, std::size_t indent) const;

    /// Columns set right below their headings; empty where the width does not suffice.
    [[nodiscard]] std::string grid(const std::vector<std::vector<std::string>>& rows,
                                   std::size_t indent) const;

private:
    std::size_t columns_;
    bool colour_;
};

/// Well-formed, in one line, without control characters.
[[nodiscard]] std::string harmless(std::string_view foreign);

} // namespace tonewalk
