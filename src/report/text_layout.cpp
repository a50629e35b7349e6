// SPDX-License-Identifier: GPL-3.0-or-later
#include "text_layout.hpp"

#include <algorithm>

#include <fmt/format.h>

#include "tonewalk/base/text.hpp"

namespace tonewalk {
namespace {

std::string padding(std::size_t width, std::size_t used) {
    return std::string(width > used ? width - used : 0, ' ');
}

std::string_view escape_for(ink colour) {
    switch (colour) {
    case ink::strong:
        return "\x1B[1m";
    case ink::faint:
        return "\x1B[2m";
    case ink::alarm:
        return "\x1B[33m";
    case ink::plain:
        break;
    }
    return "";
}

} // namespace

std::string text_layout::paragraph(std::string_view text, std::size_t indent,
                                   std::size_t hanging) const {
    std::string wrapped;
    for (const std::string& line : wrapped_lines(text, columns_ - indent, hanging))
        wrapped +=
            fmt::format("{}{}\n", padding(indent + (wrapped.empty() ? 0 : hanging), 0), line);
    return wrapped.empty() ? "\n" : wrapped;
}

std::string text_layout::coloured(std::string_view text, ink colour) const {
    if (!colour_ || colour == ink::plain)
        return std::string{text};
    return fmt::format("{}{}\x1B[0m", escape_for(colour), text);
}

std::string text_layout::pairs(const std::vector<pair>& lines, std::size_t indent) const {
    std::size_t label_width = 0;
    for (const pair& each : lines)
        label_width = std::max(label_width, width_of(each.label));
    label_width = std::min(label_width, columns_ / 2);
    std::string text;
    for (const pair& each : lines) {
        const std::size_t label = width_of(each.label);
        const bool fits =
            std::max(label, label_width) + indent + 2 + width_of(each.value) <= columns_;
        text += std::string(indent, ' ') + each.label;
        text += fits ? padding(label_width, label) + "  " + each.value + '\n'
                     : '\n' + paragraph(each.value, indent + 2);
    }
    return text;
}

std::string text_layout::grid(const std::vector<std::vector<std::string>>& rows,
                              std::size_t indent) const {
    if (rows.empty())
        return {};
    std::vector<std::size_t> widths(rows.front().size());
    for (const auto& row : rows)
        for (std::size_t c = 0; c < row.size(); ++c)
            widths[c] = std::max(widths[c], width_of(row[c]));
    std::size_t total = indent;
    for (const std::size_t each : widths)
        total += each + 2;
    if (total > columns_ + 2)
        return {};
    std::string text;
    for (const auto& row : rows) {
        text += std::string(indent, ' ');
        for (std::size_t c = 0; c < row.size(); ++c)
            text += (c > 0 ? "  " : "") + padding(widths[c], width_of(row[c])) + row[c];
        text += '\n';
    }
    return text;
}

std::string harmless(std::string_view foreign) {
    return one_line(valid_utf8(foreign));
}

} // namespace tonewalk
