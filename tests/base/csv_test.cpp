// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/base/csv.hpp"

#include "support/expect_error.hpp"
#include "support/temporary_folder.hpp"

namespace {

using namespace tonewalk;
using test::caught;

TEST(ParseCsv, TakesCommaAndSemicolonLfAndCrlfAndAByteOrderMark) {
    const test::temporary_folder folder;
    test::write_file(folder / "marks.csv",
                     "\xEF\xBB\xBFtime_s;position_m\r\n0;1.5\r\n\r\n10;-2e1\r\n");
    const csv_table marks = read_csv(folder / "marks.csv");
    EXPECT_EQ(marks.header(), (std::vector<std::string>{"time_s", "position_m"}));
    EXPECT_EQ(marks.numbers("position_m"), (std::vector<double>{1.5, -20.0}));
    const csv_table comma = parse_csv("time_s, angle_deg\n0, 90\n1,180", "turn.csv");
    EXPECT_EQ(comma.numbers("angle_deg"), (std::vector<double>{90.0, 180.0}));
}

// CSV-1: RFC 4180, section 2 (quoted fields, doubled quotes, line breaks inside quotes).
TEST(ParseCsv, ReadsQuotedFieldsAsRfc4180Says) {
    const csv_table table =
        parse_csv("a,b\r\n\"x,1\",\"say \"\"on\"\"\"\r\n\"two\r\nlines\",c\r\n5,6\r\n", "q.csv");
    ASSERT_EQ(table.rows(), 3U);
    EXPECT_EQ(table.text(0, 0), "x,1");
    EXPECT_EQ(table.text(0, 1), "say \"on\"");
    EXPECT_EQ(table.text(1, 0), "two\nlines");
    EXPECT_EQ(table.where(2, 0), "q.csv, line 5, a"); // the line break inside counts
}

TEST(ParseCsv, TakesAnEmptyFieldAsNothingWhereThatIsAllowed) {
    const csv_table table = parse_csv("a,b\n1,\n", "e.csv");
    EXPECT_FALSE(table.number_or_empty(0, 1).has_value());
    EXPECT_EQ(table.number_or_empty(0, 0), 1.0);
    EXPECT_TRUE(caught([&] { (void)table.number(0, 1); }).says("e.csv, line 2, b: is empty"));
}

TEST(MalformedCsv, NamesADecimalCommaAsSuch) {
    const csv_table table = parse_csv("time_s;position_m\n0;1,5\n", "marks.csv");
    const auto comma = caught([&] { (void)table.numbers("position_m"); });
    EXPECT_EQ(comma.kind, fault::malformed);
    EXPECT_EQ(comma.line,
              "marks.csv, line 2, position_m: \"1,5\" has a decimal comma; write a decimal point");
    const auto fields = caught([] { (void)parse_csv("time_s,position_m\n0,1,5\n", "marks.csv"); });
    EXPECT_TRUE(fields.says("marks.csv, line 2: has 3 fields")) << fields.line;
    EXPECT_TRUE(fields.says("decimal comma")) << fields.line;
}

TEST(MalformedCsv, IsRefusedWithItsLine) {
    EXPECT_TRUE(caught([] { (void)parse_csv("", "x.csv"); }).says("x.csv: is empty"));
    EXPECT_TRUE(
        caught([] { (void)parse_csv("a,b\n1,2\n3\n", "x.csv"); }).says("line 3: has 1 fields"));
    EXPECT_TRUE(caught([] {
                    (void)parse_csv("a,b\n1,2\n\"3\"x,4\n", "x.csv");
                }).says("line 3: has a quote"));
    EXPECT_TRUE(caught([] { (void)parse_csv("a,b\n1,\"2\n", "x.csv"); }).says("has a quote"));
    const csv_table table = parse_csv("time,b\nx,2\n", "x.csv");
    EXPECT_TRUE(
        caught([&] { (void)table.column("time_s"); }).says("is time meant? rename it to time_s"));
    EXPECT_TRUE(caught([&] { (void)table.number(0, 0); }).says("\"x\" is not a number"));
    EXPECT_TRUE(caught([&] {
                    table.allow_only({"time", "c"});
                }).says("column \"b\" is not known here"));
}

} // namespace
