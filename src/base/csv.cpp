// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/base/csv.hpp"

#include <algorithm>
#include <cassert>
#include <functional>
#include <memory>
#include <utility>

#include <csv.h>
#include <fmt/format.h>

#include "tonewalk/base/error.hpp"
#include "tonewalk/base/near_name.hpp"
#include "tonewalk/base/text.hpp"

namespace tonewalk {
namespace {

/// The C parser's state, freed in every case.
class field_parser {
public:
    using row_sink = std::function<void(std::vector<std::string> fields, std::size_t line)>;

    field_parser(char delimiter, row_sink sink) : sink_{std::move(sink)} {
        // Line ends inside the text are reported as rows, so that lines can be counted.
        constexpr unsigned char options = CSV_STRICT | CSV_STRICT_FINI | CSV_REPALL_NL;
        if (csv_init(&parser_, options) != 0)
            throw std::bad_alloc{};
        csv_set_delim(&parser_, static_cast<unsigned char>(delimiter));
    }
    field_parser(const field_parser&) = delete;
    field_parser& operator=(const field_parser&) = delete;
    ~field_parser() { csv_free(&parser_); }

    /// Whether the quoting is right; line() is where it stopped.
    bool parse(std::string_view text) {
        const std::size_t done =
            csv_parse(&parser_, text.data(), text.size(), take_field, take_row, this);
        return done == text.size() && csv_fini(&parser_, take_field, take_row, this) == 0;
    }
    [[nodiscard]] std::size_t line() const noexcept { return line_; }

private:
    static void take_field(void* text, std::size_t length, void* self) {
        auto* const parser = static_cast<field_parser*>(self);
        parser->fields_.emplace_back(static_cast<const char*>(text), length);
    }
    static void take_row(int, void* self) { static_cast<field_parser*>(self)->end_row(); }

    void end_row() {
        std::size_t line_ends_inside = 0;
        for (const std::string& field : fields_)
            line_ends_inside +=
                static_cast<std::size_t>(std::count(field.begin(), field.end(), '\n'));
        if (!fields_.empty())
            sink_(std::exchange(fields_, {}), line_);
        line_ += 1 + line_ends_inside;
    }

    csv_parser parser_{};
    row_sink sink_;
    std::vector<std::string> fields_;
    std::size_t line_ = 1;
};

std::string with_plain_line_ends(std::string_view text) {
    std::string plain;
    plain.reserve(text.size());
    for (std::size_t i = 0; i < text.size(); ++i)
        if (text[i] != '\r' || i + 1 == text.size() || text[i + 1] != '\n')
            plain += text[i];
    return plain;
}

/// Semicolons where the header row has them and no comma outside quotes.
char delimiter_of(std::string_view text) {
    bool quoted_part = false, semicolon = false;
    for (const char letter : text.substr(0, text.find('\n', text.find_first_not_of('\n')))) {
        if (letter == '"')
            quoted_part = !quoted_part;
        else if (letter == ',' && !quoted_part)
            return ',';
        else if (letter == ';' && !quoted_part)
            semicolon = true;
    }
    return semicolon ? ';' : ',';
}

} // namespace

bool csv_table::has(std::string_view name) const noexcept {
    return std::find(header_.begin(), header_.end(), name) != header_.end();
}

std::size_t csv_table::column(std::string_view name) const {
    const auto found = std::find(header_.begin(), header_.end(), name);
    if (found == header_.end()) {
        const std::string nearest = near_name(name, header_);
        throw error{fault::malformed, fmt::format("has no column {}", name), name_ + ", line 1",
                    nearest.empty() ? fmt::format("add the column {}", name)
                                    : fmt::format("is {} meant? rename it to {}", nearest, name)};
    }
    return static_cast<std::size_t>(found - header_.begin());
}

const std::string& csv_table::text(std::size_t row, std::size_t column) const {
    assert(row < rows_.size() && column < header_.size());
    return rows_[row].fields[column];
}

double csv_table::number(std::size_t row, std::size_t column) const {
    const std::string& field = text(row, column);
    if (const auto value = parse_plain_number(trimmed(field)))
        return *value;
    if (has_decimal_comma(trimmed(field)))
        throw error{fault::malformed, fmt::format("{} has a decimal comma", in_quotes(field)),
                    where(row, column), "write a decimal point"};
    throw error{fault::malformed,
                field.empty() ? "is empty" : fmt::format("{} is not a number", in_quotes(field)),
                where(row, column), "write a number like 12.5"};
}

std::optional<double> csv_table::number_or_empty(std::size_t row, std::size_t column) const {
    if (trimmed(text(row, column)).empty())
        return std::nullopt;
    return number(row, column);
}

std::vector<double> csv_table::numbers(std::string_view name) const {
    const std::size_t position = column(name);
    std::vector<double> values(rows());
    for (std::size_t row = 0; row < rows(); ++row)
        values[row] = number(row, position);
    return values;
}

void csv_table::allow_only(std::initializer_list<std::string_view> columns) const {
    for (const std::string& name : header_)
        if (std::find(columns.begin(), columns.end(), name) == columns.end())
            throw error{fault::malformed,
                        fmt::format("column {} is not known here", in_quotes(name)),
                        name_ + ", line 1", name_hint(name, {columns.begin(), columns.size()})};
}

std::string csv_table::where(std::size_t row, std::size_t column) const {
    return fmt::format("{}, line {}, {}", name_, rows_[row].line, header_[column]);
}

void csv_table::add(record next) {
    if (header_.empty()) {
        header_ = std::move(next.fields);
        return;
    }
    if (next.fields.size() == header_.size()) {
        rows_.push_back(std::move(next));
        return;
    }
    const bool more = next.fields.size() > header_.size();
    throw error{
        fault::malformed,
        fmt::format("has {} fields where the header has {}", next.fields.size(), header_.size()),
        fmt::format("{}, line {}", name_, next.line),
        more ? "a decimal comma? write decimal points, or semicolons between fields"
             : "give every line the same fields"};
}

csv_table read_csv(const std::filesystem::path& file) {
    return parse_csv(read_text_file(file), file);
}

csv_table parse_csv(std::string_view text, const std::filesystem::path& name) {
    csv_table table;
    table.name_ = valid_utf8(name.string());
    const std::string plain = with_plain_line_ends(text);
    field_parser parser{delimiter_of(plain),
                        [&](std::vector<std::string> fields, std::size_t line) {
                            table.add({std::move(fields), line});
                        }};
    if (!parser.parse(plain))
        throw error{fault::malformed, "has a quote out of place",
                    fmt::format("{}, line {}", table.name_, parser.line()),
                    "put quotes round the whole field and double those inside"};
    if (table.header_.empty())
        throw error{fault::malformed, "is empty", table.name_,
                    "begin it with a row of column names"};
    return table;
}

} // namespace tonewalk
