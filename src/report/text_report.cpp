// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/report/text_report.hpp"

#include <algorithm>
#include <cmath>

#include <fmt/format.h>
#include <fmt/ranges.h>

#include "text_layout.hpp"
#include "text_value.hpp"
#include "tonewalk/base/quantity.hpp"
#include "tonewalk/report/level_plot.hpp"

namespace tonewalk {
namespace {

using strings = std::vector<std::string>;

constexpr std::size_t most_parts = 5;       // of a list that are shown whole
constexpr std::size_t most_nested_rows = 4; // of a table inside a part

/// Puts a sheet and its nested parts below each other.
class sheet_printer {
public:
    sheet_printer(const text_layout& layout, std::size_t table_rows)
        : layout_{layout}, table_rows_{table_rows} {}

    [[nodiscard]] std::string print(const sheet& page, std::size_t indent) const {
        std::string text = entries(page, indent);
        for (const auto& item : page.items) {
            if (const auto* table = std::get_if<sheet_table>(&item))
                text += print(*table, indent);
            else if (const auto* group = std::get_if<sheet_group>(&item))
                text += print(*group, indent);
        }
        return text;
    }

private:
    [[nodiscard]] std::string heading(std::string_view words, std::size_t indent) const {
        return fmt::format("\n{}{}\n", std::string(indent, ' '),
                           layout_.coloured(words, ink::strong));
    }

    [[nodiscard]] std::string entries(const sheet& page, std::size_t indent) const {
        std::vector<std::string_view> keys;
        std::vector<const sheet_entry*> found;
        for (const auto& item : page.items)
            if (const auto* entry = std::get_if<sheet_entry>(&item)) {
                keys.push_back(entry->key);
                found.push_back(entry);
            }
        std::vector<text_layout::pair> lines;
        for (const value_group& each : group_by_value(keys)) {
            const auto number = [&](const std::optional<std::size_t>& place) {
                return place ? number_in(found[*place]->value) : not_measured;
            };
            const sheet_entry& entry = *found[each.value];
            const figure shown{entry.value, number(each.u95), number(each.low95),
                               number(each.high95), entry.unit};
            lines.push_back({label_of(entry.key), harmless(text_of(shown))});
            if (is_alternative(entry.key))
                settle_alternative(lines, entry);
        }
        return layout_.pairs(lines, indent);
    }

    /// "swing_at_least" stands in for "swing_db" where that is null, and else says nothing.
    static bool is_alternative(std::string_view key) {
        return key.ends_with("_at_least") || key.ends_with("_at_most");
    }
    static void settle_alternative(std::vector<text_layout::pair>& lines,
                                   const sheet_entry& entry) {
        const text_layout::pair own = lines.back();
        lines.pop_back();
        if (!std::isfinite(number_in(entry.value)))
            return;
        const std::size_t ending = own.label.rfind(" at ");
        const std::string stem = own.label.substr(0, ending);
        const std::string words = own.label.substr(ending + 1) + ' ' + own.value;
        if (!lines.empty() && lines.back().label == stem)
            lines.back().value = words;
        else
            lines.push_back({stem, words});
    }

    [[nodiscard]] std::string print(const sheet_group& group, std::size_t indent) const {
        std::string text;
        const std::size_t shown = std::min(group.parts.size(), most_parts);
        for (std::size_t i = 0; i < shown; ++i) {
            std::string label = label_of(group.key);
            if (group.list) { // "carriers": one of them is "carrier 2"
                label.resize(label.size() - (label.ends_with('s') ? 1 : 0));
                label += fmt::format(" {}", i + 1);
            }
            text += heading(label, indent);
            text += print(group.parts[i], indent + 2);
        }
        if (shown < group.parts.size())
            text += fmt::format("\n{}and {} more {}\n", std::string(indent, ' '),
                                group.parts.size() - shown, label_of(group.key));
        return text;
    }

    [[nodiscard]] std::string print(const sheet_table& table, std::size_t indent) const {
        if (table.form == table_form::as_columns || table.rows == 0)
            return fmt::format("\n{}{}: {}\n", std::string(indent, ' '), label_of(table.key),
                               table.rows == 0 ? "none" : fmt::format("{} records", table.rows));
        std::string text = heading(label_of(table.key), indent);
        const std::size_t most =
            indent == 0 ? table_rows_ : std::min(table_rows_, most_nested_rows);
        const std::size_t shown = std::min(table.rows, most);
        const std::string grid = layout_.grid(grid_of(table, shown), indent + 2);
        text += grid.empty() ? listed(table, shown, indent + 2) : grid;
        if (shown < table.rows)
            text +=
                fmt::format("{}and {} more\n", std::string(indent + 2, ' '), table.rows - shown);
        return text;
    }

    [[nodiscard]] static std::vector<value_group> groups_of(const sheet_table& table) {
        std::vector<std::string_view> keys;
        for (const sheet_column& each : table.columns)
            keys.push_back(each.key);
        return group_by_value(keys);
    }

    [[nodiscard]] static std::string cell_of(const sheet_table& table, const value_group& group,
                                             std::size_t row, bool with_unit) {
        const auto number = [&](const std::optional<std::size_t>& place) {
            return place ? number_in(table.columns[*place].at(row)) : not_measured;
        };
        const sheet_column& column = table.columns[group.value];
        std::string text = harmless(text_of({column.at(row), number(group.u95), number(group.low95),
                                             number(group.high95), column.unit}));
        if (!with_unit && unit_stands_in_heading(column) && text.ends_with(' ' + column.unit))
            text.resize(text.size() - 1 - column.unit.size());
        return text;
    }

    /// Hertz stay with their figures: prefixes differ from row to row.
    [[nodiscard]] static bool unit_stands_in_heading(const sheet_column& column) {
        return !column.unit.empty() && column.unit != "Hz";
    }

    /// Headings with units, then the rows; for a wide screen.
    [[nodiscard]] static std::vector<strings> grid_of(const sheet_table& table, std::size_t rows) {
        const auto groups = groups_of(table);
        std::vector<strings> grid(1);
        for (const value_group& each : groups) {
            const sheet_column& column = table.columns[each.value];
            const std::string label = label_of(column.key);
            grid[0].push_back(unit_stands_in_heading(column)
                                  ? fmt::format("{} ({})", label, column.unit)
                                  : label);
        }
        for (std::size_t row = 0; row < rows; ++row) {
            strings& line = grid.emplace_back();
            for (const value_group& each : groups)
                line.push_back(cell_of(table, each, row, false));
        }
        return grid;
    }

    /// Text speaks for itself, yes is said by its name, no is left out.
    [[nodiscard]] static std::string part_of(const sheet_table& table, const value_group& group,
                                             std::size_t row) {
        const sheet_column& column = table.columns[group.value];
        const cell held = column.at(row);
        if (const auto* words = std::get_if<std::string>(&held))
            return harmless(*words);
        if (const auto* yes = std::get_if<bool>(&held))
            return *yes ? label_of(column.key) : "";
        return label_of(column.key) + ' ' + cell_of(table, group, row, true);
    }

    /// "peak, time 1.2 s, level ...": for a narrow screen.
    [[nodiscard]] std::string listed(const sheet_table& table, std::size_t rows,
                                     std::size_t indent) const {
        std::string text;
        for (std::size_t row = 0; row < rows; ++row) {
            strings parts;
            for (const value_group& each : groups_of(table)) {
                std::string part = part_of(table, each, row);
                if (!part.empty())
                    parts.push_back(std::move(part));
            }
            text += layout_.paragraph(fmt::format("{}", fmt::join(parts, ", ")), indent, 2);
        }
        return text;
    }

    const text_layout& layout_;
    std::size_t table_rows_;
};

std::string rate_text(double rate_hz) {
    std::string text = format_hz(rate_hz);
    return text.replace(text.size() - 2, 2, "S/s");
}

std::string recording_text(const recording_summary& recording, const text_layout& layout) {
    strings facts{harmless(recording.format), rate_text(recording.sample_rate_hz)};
    if (recording.centre_hz)
        facts.push_back("centre " + format_hz(*recording.centre_hz));
    if (recording.start_utc)
        facts.push_back("from " + format_utc(*recording.start_utc, 0));
    facts.push_back(time_text(recording.duration_s) + " measured");
    if (recording.partial)
        facts.push_back("stopped early");
    return layout.paragraph(harmless(recording.name)) +
           layout.paragraph(fmt::format("{}", fmt::join(facts, ", ")));
}

std::vector<double> numbers_of(const sheet_table& table, std::string_view key) {
    std::vector<double> numbers(table.rows, not_measured);
    if (const sheet_column* column = find_column(table, key))
        for (std::size_t row = 0; row < table.rows; ++row)
            numbers[row] = number_in(column->at(row));
    return numbers;
}

std::vector<level_plot::mark> marks_of(const sheet& result) {
    const sheet_table* const extrema = find_table(result, "extrema");
    const sheet_column* const kind = extrema != nullptr ? find_column(*extrema, "kind") : nullptr;
    if (kind == nullptr)
        return {};
    const std::vector<double> time_s = numbers_of(*extrema, "time_s");
    std::vector<level_plot::mark> marks;
    for (std::size_t row = 0; row < extrema->rows; ++row)
        if (std::isfinite(time_s[row]))
            marks.push_back({time_s[row], kind->at(row) == cell{std::string{"null"}} ? 'N' : 'P'});
    return marks;
}

std::string plot_text(const sheet& result, const text_report_options& options) {
    const sheet_table* const log = find_table(result, "log");
    if (log == nullptr || options.plot_column.empty())
        return {};
    const sheet_column* const column = find_column(*log, options.plot_column);
    if (column == nullptr)
        return {};
    const level_plot plot{fmt::format("{} ({})", label_of(column->key), column->unit),
                          numbers_of(*log, "time_s"), numbers_of(*log, column->key),
                          numbers_of(*log, column->key + "_high95"), marks_of(result)};
    return '\n' + draw(plot, options.columns);
}

/// Of the signal only what is known: "carrier not measured" would look like a failure where merely
/// the recording's centre is not stated.
sheet known_part(const sheet& signal) {
    sheet known;
    for (const auto& item : signal.items) {
        const auto* const entry = std::get_if<sheet_entry>(&item);
        const bool is_null =
            entry != nullptr && (std::holds_alternative<std::monostate>(entry->value) ||
                                 (std::holds_alternative<double>(entry->value) &&
                                  std::isnan(std::get<double>(entry->value))));
        if (!is_null)
            known.items.push_back(item);
    }
    return known;
}

/// "gain control: why not" for each part that could not be judged: its first entry is null, and it
/// says what was missing as its evidence.
std::string unjudged_text(const sheet& result, const text_layout& layout) {
    std::string text;
    for (const auto& item : result.items) {
        const auto* const group = std::get_if<sheet_group>(&item);
        if (group == nullptr || group->list)
            continue;
        const sheet& part = group->parts.front();
        const cell* const evidence = part.find("evidence");
        const auto* const first = std::get_if<sheet_entry>(&part.items.front());
        if (evidence != nullptr && first != nullptr &&
            std::holds_alternative<std::monostate>(first->value))
            text += layout.paragraph(fmt::format("not judged: {}: {}", label_of(group->key),
                                                 harmless(std::get<std::string>(*evidence))),
                                     2, 2);
    }
    return text;
}

/// How many doubts, and for each what was seen and what to do; and what could not be judged.
std::string verdict_text(const note_set& notes, const sheet& result, const text_layout& layout) {
    strings doubts;
    for (const note& each : notes.all())
        if (each.level == severity::warning)
            doubts.push_back(layout.coloured(layout.paragraph(name(each.code), 2), ink::strong) +
                             layout.paragraph("seen: " + harmless(each.text), 4, 2) +
                             layout.paragraph("do: " + harmless(each.advice), 4, 2));
    const std::string headline = doubts.empty() ? "no doubt: nothing seen speaks against its levels"
                                 : doubts.size() == 1 ? "1 doubt"
                                                      : fmt::format("{} doubts", doubts.size());
    return '\n' +
           layout.coloured(layout.paragraph(headline), doubts.empty() ? ink::strong : ink::alarm) +
           fmt::format("{}", fmt::join(doubts, "")) + unjudged_text(result, layout);
}

} // namespace

std::string summary_text(const report_context& context, const sheet& result,
                         const text_report_options& options) {
    const text_layout layout{options.columns, options.colour};
    const sheet_printer printer{layout, options.table_rows};
    std::string text;
    for (const recording_summary& each : context.recordings)
        text += recording_text(each, layout);
    if (options.verdict_first)
        text += verdict_text(context.notes, result, layout);
    if (context.signal)
        text += '\n' + printer.print(known_part(*context.signal), 0);
    text += '\n' + printer.print(result, 0);
    return text + plot_text(result, options);
}

std::string notes_text(const note_set& notes, const text_report_options& options) {
    const text_layout layout{options.columns, options.colour};
    std::string text;
    for (const note& each : notes.all()) {
        const bool warns = each.level == severity::warning;
        if (warns ? options.verdict_first : !options.info_notes)
            continue;
        const std::string advice = each.advice.empty() ? "" : "; " + each.advice;
        const std::string line =
            layout.paragraph(fmt::format("{} {}: {}{}", name(each.level), name(each.code),
                                         harmless(each.text), harmless(advice)),
                             0, 2);
        text += layout.coloured(line, warns ? ink::alarm : ink::plain);
    }
    return text;
}

std::string cautions_text(const std::vector<std::string>& cautions,
                          const text_report_options& options) {
    const text_layout layout{options.columns, options.colour};
    std::string text;
    for (const std::string& each : cautions)
        text += layout.coloured(layout.paragraph("caution: " + each, 0, 2), ink::faint);
    return text;
}

} // namespace tonewalk
