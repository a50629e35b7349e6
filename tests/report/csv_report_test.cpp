// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/report/csv_report.hpp"

#include <fmt/format.h>

#include "report/sample_report.hpp"
#include "support/run_command.hpp"
#include "tonewalk/base/csv.hpp"

namespace {

using namespace tonewalk;

std::string csv_of(const sheet_table& table) {
    const test::temporary_folder folder;
    output_file file{folder / "a.csv"};
    write_csv(file, table);
    file.commit();
    return test::read_file(folder / "a.csv");
}

sheet_table awkward_table() {
    sheet_table table{"t", 2, {}, table_form::as_columns};
    table.columns = {
        {"name", "",
         [](std::size_t row) { return cell{std::string{row == 0 ? "a, \"b\"\nc" : ""}}; }},
        {"level_dbfs", "dBFS",
         [](std::size_t row) { return cell{row == 0 ? -1.0 / 3.0 : not_measured}; }},
        {"detected", "", [](std::size_t row) { return cell{row == 0}; }},
        {"count", "", [](std::size_t row) { return row == 0 ? cell{std::int64_t{-7}} : cell{}; }},
    };
    return table;
}

TEST(CsvReport, WritesOneHeaderRowAndEmptyFieldsForNull) {
    EXPECT_EQ(csv_of(awkward_table()), "name,level_dbfs,detected,count\n"
                                       "\"a, \"\"b\"\"\nc\",-0.3333333333333333,true,-7\n"
                                       ",,false,\n");
}

TEST(CsvReport, IsReadBackByTheOwnReader) {
    const sheet result = test::sample_result();
    const sheet_table& log = *find_table(result, "log");
    const csv_table read = parse_csv(csv_of(log), "log.csv");
    ASSERT_EQ(read.rows(), log.rows);
    ASSERT_EQ(read.header().size(), log.columns.size());
    EXPECT_EQ(read.number(2, read.column("tone_dbfs")), -1.0 / 3.0);
    EXPECT_FALSE(read.number_or_empty(1, read.column("tone_dbfs")).has_value());
    EXPECT_EQ(read.text(1, read.column("flags")), "weak-tone floor-limited");
}

// Outside truth: Python's csv module (RFC 4180, CSV-1).
TEST(OutsideCsvReport, IsReadByPythonsCsvModule) {
    const test::temporary_folder folder;
    test::write_file(folder / "a.csv", csv_of(awkward_table()));
    const std::string program =
        fmt::format("import csv; rows = list(csv.DictReader(open('{}', newline='', "
                    "encoding='utf-8'), strict=True)); "
                    "assert len(rows) == 2, rows; assert rows[0]['name'] == 'a, \"b\"\\nc', rows; "
                    "assert float(rows[0]['level_dbfs']) == -1/3, rows; assert "
                    "rows[1]['level_dbfs'] == '', rows; "
                    "assert rows[1]['count'] == '' and rows[0]['count'] == '-7', rows",
                    (folder / "a.csv").string());
    const auto read = test::run_command(
        fmt::format("{} -c {}", TONEWALK_TEST_PYTHON, test::shell_quoted(program)));
    EXPECT_EQ(read.status, 0) << read.output;
}

} // namespace
