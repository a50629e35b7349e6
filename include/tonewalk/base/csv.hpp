// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <filesystem>
#include <initializer_list>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

namespace tonewalk {

/// A small CSV file with one header row, held as text. Comma or semicolon between fields (the
/// header row tells), LF or CRLF, byte-order mark allowed, empty lines skipped, quotes as in RFC
/// 4180. Everything wrong throws error{malformed} naming file, line, column and mend.
class csv_table {
public:
    [[nodiscard]] std::size_t rows() const noexcept { return rows_.size(); }
    [[nodiscard]] const std::vector<std::string>& header() const noexcept { return header_; }
    [[nodiscard]] bool has(std::string_view column) const noexcept;

    /// Position of a column; throws, with the nearest name, where there is none.
    [[nodiscard]] std::size_t column(std::string_view name) const;
    [[nodiscard]] const std::string& text(std::size_t row, std::size_t column) const;
    /// A finite number; throws where the field is empty or no number, naming a decimal comma as
    /// such.
    [[nodiscard]] double number(std::size_t row, std::size_t column) const;
    [[nodiscard]] std::optional<double> number_or_empty(std::size_t row, std::size_t column) const;
    [[nodiscard]] std::vector<double> numbers(std::string_view column) const;

    /// Refuses columns that are not among these.
    void allow_only(std::initializer_list<std::string_view> columns) const;

    /// "marks.csv, line 3, time_s": for errors that only the caller can find.
    [[nodiscard]] std::string where(std::size_t row, std::size_t column) const;

private:
    friend csv_table parse_csv(std::string_view text, const std::filesystem::path& name);
    struct record {
        std::vector<std::string> fields;
        std::size_t line = 0;
    };
    void add(record);
    std::string name_;
    std::vector<std::string> header_;
    std::vector<record> rows_;
};

/// Throws error{unreadable} too.
[[nodiscard]] csv_table read_csv(const std::filesystem::path&);
[[nodiscard]] csv_table parse_csv(std::string_view text, const std::filesystem::path& name);

} // namespace tonewalk
