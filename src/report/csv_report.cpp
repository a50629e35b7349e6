// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/report/csv_report.hpp"

#include <cmath>

#include <fmt/core.h>

#include "tonewalk/base/text.hpp"

namespace tonewalk {
namespace {

std::string field(std::string_view text) {
    std::string valid = valid_utf8(text);
    if (valid.find_first_of(",\"\r\n") == valid.npos)
        return valid;
    std::string quoted_text = "\"";
    for (const char letter : valid)
        quoted_text += letter == '"' ? std::string{"\"\""} : std::string{letter};
    return quoted_text + '"';
}

struct field_writer {
    std::string& line;
    void operator()(std::monostate) const {}
    void operator()(bool yes) const { line += yes ? "true" : "false"; }
    void operator()(std::int64_t count) const { line += std::to_string(count); }
    void operator()(double figure) const {
        if (std::isfinite(figure))
            line += fmt::format("{}", figure);
    }
    void operator()(const std::string& words) const { line += field(words); }
};

} // namespace

void write_csv(output_file& out, const sheet_table& table) {
    std::string line;
    for (const sheet_column& column : table.columns)
        line += (line.empty() ? "" : ",") + field(column.key);
    out.write(line + '\n');
    for (std::size_t row = 0; row < table.rows; ++row) {
        line.clear();
        for (std::size_t column = 0; column < table.columns.size(); ++column) {
            if (column > 0)
                line += ',';
            std::visit(field_writer{line}, table.columns[column].at(row));
        }
        line += '\n';
        out.write(line);
    }
}

} // namespace tonewalk
