// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/report/level_plot.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <cstddef>
#include <limits>
#include <optional>

#include <fmt/format.h>

#include "text_value.hpp"

namespace tonewalk {
namespace {

constexpr double infinity = std::numeric_limits<double>::infinity();
constexpr int narrowest = 24;

/// What one column of characters shows.
struct column {
    double low = infinity, high = -infinity; ///< of the levels
    double bound = -infinity;                ///< highest of the bounds
    bool seen = false;                       ///< holds a record
    char mark = ' ';
    [[nodiscard]] bool has_level() const { return low <= high; }
    [[nodiscard]] bool has_bound() const { return std::isfinite(bound); }
};

/// The usual spacing of records: the median step.
double usual_step(const std::vector<double>& time_s) {
    std::vector<double> steps;
    for (std::size_t i = 1; i < time_s.size(); ++i)
        steps.push_back(time_s[i] - time_s[i - 1]);
    if (steps.empty())
        return 1.0;
    const auto middle = steps.begin() + static_cast<std::ptrdiff_t>(steps.size() / 2);
    std::nth_element(steps.begin(), middle, steps.end());
    return *middle;
}

/// Which column a time falls in.
class time_axis {
public:
    time_axis(const std::vector<double>& time_s, int columns)
        : step_s_{usual_step(time_s)}, start_s_{time_s.front() - 0.5 * step_s_},
          column_s_{(time_s.back() + 0.5 * step_s_ - start_s_) / columns}, last_{columns - 1} {}
    [[nodiscard]] std::size_t column_of(double time_s) const {
        const double place = std::floor((time_s - start_s_) / column_s_);
        return static_cast<std::size_t>(std::clamp(place, 0.0, static_cast<double>(last_)));
    }
    [[nodiscard]] double middle_of(std::size_t column) const {
        return start_s_ + (static_cast<double>(column) + 0.5) * column_s_;
    }
    [[nodiscard]] double step_s() const { return step_s_; }

private:
    double step_s_, start_s_, column_s_;
    int last_;
};

void add_record(column& into, const level_plot& plot, std::size_t record) {
    into.seen = true;
    const double level = plot.level[record], bound = plot.bound[record];
    if (std::isfinite(level)) {
        into.low = std::min(into.low, level);
        into.high = std::max(into.high, level);
    } else if (std::isfinite(bound)) {
        into.bound = std::max(into.bound, bound);
    }
}

/// Where columns are narrower than records, the empty ones between show the nearest record.
void fill_between(std::vector<column>& columns, const time_axis& axis, const level_plot& plot) {
    for (std::size_t c = 0; c < columns.size(); ++c) {
        if (columns[c].seen)
            continue;
        const double middle = axis.middle_of(c);
        auto next = std::lower_bound(plot.time_s.begin(), plot.time_s.end(), middle);
        if (next == plot.time_s.end() ||
            (next != plot.time_s.begin() && middle - *(next - 1) < *next - middle))
            --next;
        if (std::abs(*next - middle) <= 0.75 * axis.step_s())
            add_record(columns[c], plot, static_cast<std::size_t>(next - plot.time_s.begin()));
    }
}

std::vector<column> gather(const level_plot& plot, int width) {
    const time_axis axis{plot.time_s, width};
    std::vector<column> columns(static_cast<std::size_t>(width));
    for (std::size_t record = 0; record < plot.time_s.size(); ++record)
        add_record(columns[axis.column_of(plot.time_s[record])], plot, record);
    fill_between(columns, axis, plot);
    for (const level_plot::mark& each : plot.marks) {
        char& mark = columns[axis.column_of(each.time_s)].mark;
        if (mark != 'N') // a null matters more than a peak beside it
            mark = each.letter;
    }
    return columns;
}

/// Round steps of the level axis, and how many rows of characters one takes.
struct level_axis {
    double bottom = 0.0, step = 1.0;
    int steps = 1, rows_per_step = 2;
    [[nodiscard]] int rows() const { return steps * rows_per_step + 1; }
    /// Of the rows that stand at a step; others have none.
    [[nodiscard]] std::string label(int row) const {
        const int whole_steps = row / rows_per_step;
        return row % rows_per_step == 0 ? fmt::format("{:.0f}", bottom + step * whole_steps) : "";
    }
    /// Half rows from the bottom.
    [[nodiscard]] int place(double level) const {
        return static_cast<int>(std::lround((level - bottom) / step * 2.0 * rows_per_step));
    }
};

level_axis make_axis(double low, double high) {
    constexpr double least_span = 2.0;
    constexpr int most_steps = 5, wanted_rows = 12;
    constexpr std::array<double, 7> round_steps{1.0, 2.0, 5.0, 10.0, 20.0, 50.0, 100.0};
    if (high - low < least_span) {
        const double middle = 0.5 * (low + high);
        low = middle - 0.5 * least_span;
        high = middle + 0.5 * least_span;
    }
    level_axis axis;
    for (const double step : round_steps) {
        axis.step = step;
        axis.bottom = std::floor(low / step) * step;
        axis.steps = static_cast<int>(std::ceil((high - axis.bottom) / step));
        if (axis.steps <= most_steps)
            break;
    }
    axis.rows_per_step = std::max(2, wanted_rows / axis.steps);
    return axis;
}

std::optional<level_axis> axis_for(const std::vector<column>& columns) {
    double low = infinity, high = -infinity;
    for (const column& each : columns) {
        low = std::min(low, each.low);
        high = std::max(high, each.high);
        if (each.has_bound()) {
            low = std::min(low, each.bound);
            high = std::max(high, each.bound);
        }
    }
    if (!(low <= high))
        return std::nullopt;
    return make_axis(low, high);
}

/// Rows of characters from the bottom up, with one free row below and above for marks.
class canvas {
public:
    canvas(const level_axis& axis, std::size_t width)
        : rows_(static_cast<std::size_t>(axis.rows() + 2), std::string(width, ' ')) {}

    /// Half rows `low` to `high` of a column.
    void fill(std::size_t c, int low, int high) {
        for (int half = low; half <= high; ++half) {
            char& drawn = at(half / 2, c);
            const char added = half % 2 == 0 ? '.' : '\'';
            drawn = drawn == ' ' || drawn == added ? added : ':';
        }
    }
    void put(int row, std::size_t c, char letter) { at(row, c) = letter; }
    /// Row -1 is the free one below.
    [[nodiscard]] const std::string& row(int number) const { return rows_[place(number)]; }

private:
    static std::size_t place(int row) {
        const int from_bottom = row + 1;
        return static_cast<std::size_t>(from_bottom);
    }
    char& at(int row, std::size_t c) { return rows_[place(row)][c]; }
    std::vector<std::string> rows_;
};

/// Low and high half row of every column with a level, drawn out to meet the neighbour before.
void draw_line(canvas& drawn, const std::vector<column>& columns, const level_axis& axis) {
    for (std::size_t c = 0; c < columns.size(); ++c) {
        if (!columns[c].has_level())
            continue;
        int low = axis.place(columns[c].low), high = axis.place(columns[c].high);
        if (c > 0 && columns[c - 1].has_level()) {
            low = std::min(low, axis.place(columns[c - 1].high) + 1);
            high = std::max(high, axis.place(columns[c - 1].low) - 1);
        }
        drawn.fill(c, low, high);
    }
}

void draw_bounds_and_marks(canvas& drawn, const std::vector<column>& columns,
                           const level_axis& axis) {
    for (std::size_t c = 0; c < columns.size(); ++c) {
        const column& each = columns[c];
        int lowest = axis.rows(), highest = 0;
        if (each.has_bound()) {
            lowest = highest = axis.place(each.bound) / 2;
            drawn.put(lowest, c, 'v');
        }
        if (each.has_level()) {
            lowest = std::min(lowest, axis.place(each.low) / 2);
            highest = std::max(highest, axis.place(each.high) / 2);
        }
        if (each.mark != ' ' && lowest <= highest)
            drawn.put(each.mark == 'N' ? lowest - 1 : highest + 1, c, each.mark);
    }
}

bool is_blank(const std::string& row) {
    return row.find_first_not_of(' ') == row.npos;
}

std::string without_trailing_blanks(std::string line) {
    line.resize(line.find_last_not_of(' ') + 1);
    return line + '\n';
}

std::string time_labels(double first_s, double last_s, std::size_t width) {
    const std::string first = time_text(first_s), last = time_text(last_s);
    std::string line(width, ' ');
    const auto put = [&](const std::string& label, std::size_t place) {
        line.replace(place, label.size(), label);
    };
    put(first, 0);
    if (first.size() + last.size() + 2 <= width)
        put(last, width - last.size());
    const std::string middle = time_text(0.5 * (first_s + last_s));
    if (width >= 5 * middle.size())
        put(middle, (width - middle.size()) / 2);
    return line;
}

std::string legend(const std::vector<column>& columns) {
    const auto any = [&](auto holds) { return std::any_of(columns.begin(), columns.end(), holds); };
    std::string text;
    const auto add = [&](bool wanted, std::string_view words) {
        if (wanted)
            text += (text.empty() ? "" : "  ") + std::string{words};
    };
    add(any([](const column& each) { return each.mark == 'P'; }), "P peak");
    add(any([](const column& each) { return each.mark == 'N'; }), "N null");
    add(any([](const column& each) { return each.has_bound(); }), "v at most");
    add(any([](const column& each) { return !each.seen; }), "broken axis: gap");
    return text;
}

} // namespace

std::string draw(const level_plot& plot, int columns) {
    if (plot.time_s.empty())
        return {};
    constexpr int label_width = 5;
    const int width = std::max(columns, narrowest) - label_width - 2;
    const std::vector<column> gathered = gather(plot, width);
    const auto axis = axis_for(gathered);
    if (!axis)
        return {};
    canvas drawn{*axis, gathered.size()};
    draw_line(drawn, gathered, *axis);
    draw_bounds_and_marks(drawn, gathered, *axis);

    std::string text = plot.title + '\n';
    for (int row = axis->rows(); row >= -1; --row) {
        const bool free_row = row == axis->rows() || row == -1;
        if (free_row && is_blank(drawn.row(row)))
            continue;
        const std::string label = free_row ? "" : axis->label(row);
        text +=
            without_trailing_blanks(fmt::format("{:>{}} |{}", label, label_width, drawn.row(row)));
    }
    std::string rule;
    for (const column& each : gathered)
        rule += each.seen ? '-' : ' ';
    const std::string indent(label_width + 2, ' ');
    text += without_trailing_blanks(indent.substr(1) + '+' + rule);
    text += without_trailing_blanks(
        indent + time_labels(plot.time_s.front(), plot.time_s.back(), gathered.size()));
    if (const std::string words = legend(gathered); !words.empty())
        text += indent + words + '\n';
    return text;
}

} // namespace tonewalk
