// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <cstdint>
#include <functional>
#include <string>
#include <variant>
#include <vector>

#include "tonewalk/base/estimate.hpp"

namespace tonewalk {

/// One value of a result: null, yes/no, whole number, number (NaN and infinities become null),
/// text.
using cell = std::variant<std::monostate, bool, std::int64_t, double, std::string>;

/// A named value. `key` is the JSON name with its unit (carrier_dbfs); `unit` is for people
/// ("dBFS").
struct sheet_entry {
    std::string key;
    std::string unit;
    cell value;
};

/// A column that is computed row by row, so that a long log is never copied. What `at` looks at
/// must outlive the sheet.
struct sheet_column {
    std::string key;
    std::string unit;
    std::function<cell(std::size_t row)> at;
};

/// as_columns: {"key": {"a": [..], "b": [..]}}   (the log)
/// as_records: {"key": [{"a": .., "b": ..}, ..]} (extrema, tones)
enum class table_form { as_columns, as_records };
struct sheet_table {
    std::string key;
    std::size_t rows = 0;
    std::vector<sheet_column> columns;
    table_form form = table_form::as_columns;
};

struct sheet;
/// A nested object ({"summary": {...}}), or a list of them ({"carriers": [{...}, {...}]}).
struct sheet_group {
    std::string key;
    std::vector<sheet> parts; // one part when not a list
    bool list = false;
};

/// Something to draw: kind "line", "strip" (z row by row over x, for each y) or "fit".
struct curve {
    std::string name;
    std::string kind;
    std::string x_unit, y_unit, z_unit;
    std::vector<double> x, y, z;
};

/// Results in neutral form, in the order in which they are shown. All that judge and report know.
struct sheet {
    std::vector<std::variant<sheet_entry, sheet_table, sheet_group>> items;
    std::vector<curve> curves;

    sheet& add(std::string key, std::string unit, cell value);
    /// key, key_u95
    sheet& add(std::string key, std::string unit, const estimate&);
    /// key, key_low95, key_high95, key_u95
    sheet& add(std::string key, std::string unit, const interval_estimate&);
    sheet& add(sheet_table);
    sheet& add(std::string key, sheet part);
    sheet& add(curve);
    sheet& join(sheet part); ///< all that `part` holds, after what is here
    [[nodiscard]] const cell*
    find(std::string_view key) const noexcept; ///< a top-level entry, or null
};

} // namespace tonewalk
