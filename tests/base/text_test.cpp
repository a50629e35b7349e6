// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/base/text.hpp"

#include "support/expect_error.hpp"
#include "support/temporary_folder.hpp"

namespace {

using namespace tonewalk;

TEST(ParsePlainNumber, TakesTheWholeTextOrNothing) {
    EXPECT_EQ(parse_plain_number("-3.5e2"), -350.0);
    EXPECT_EQ(parse_plain_number("+1"), 1.0);
    for (const char* text : {"", " 1", "1 ", "1,5", "inf", "nan", "1e400", "+-1", "++1", "0x1p3"})
        EXPECT_FALSE(parse_plain_number(text).has_value()) << text;
}

TEST(HasDecimalComma, MeansOneCommaInAnOtherwisePlainNumber) {
    EXPECT_TRUE(has_decimal_comma("12,5"));
    EXPECT_TRUE(has_decimal_comma("-0,5"));
    EXPECT_FALSE(has_decimal_comma("12.5"));
    EXPECT_FALSE(has_decimal_comma("1,2,3"));
    EXPECT_FALSE(has_decimal_comma("a,b"));
}

// The Unicode Standard 15.0, table 3-7 (well-formed UTF-8 byte sequences); from memory.
TEST(ValidUtf8, ReplacesWhatIsNotWellFormed) {
    EXPECT_EQ(valid_utf8("Gr\xC3\xBC\xC3\x9F"), "Gr\xC3\xBC\xC3\x9F");
    EXPECT_EQ(valid_utf8("\xE2\x82\xAC \xF0\x9F\x93\xA1"), "\xE2\x82\xAC \xF0\x9F\x93\xA1");
    const std::string mark = "\xEF\xBF\xBD";
    EXPECT_EQ(valid_utf8("a\xFF"), "a" + mark);
    EXPECT_EQ(valid_utf8("\xC0\x80"), mark + mark);            // overlong
    EXPECT_EQ(valid_utf8("\xED\xA0\x80"), mark + mark + mark); // surrogate
    EXPECT_EQ(valid_utf8("\xF4\x90\x80\x80"), mark + mark + mark + mark);
    EXPECT_EQ(valid_utf8("\xE2\x82"), mark + mark); // cut off
}

TEST(InQuotes, FitsOneLine) {
    EXPECT_EQ(in_quotes("a\nb\x1B[31m"), "\"a?b?[31m\"");
    EXPECT_LT(in_quotes(std::string(1000, 'x')).size(), 100U);
}

TEST(OneLine, MakesControlCharactersHarmless) {
    EXPECT_EQ(one_line("a\r\n\x1B[31m\x7F\tGr\xC3\xBC\xC3\x9F"), "a???[31m??Gr\xC3\xBC\xC3\x9F");
}

// RFC 8259, section 7: quotation mark, reverse solidus and U+0000 to U+001F must be escaped.
TEST(JsonString, EscapesWhatJsonMustAndNothingElse) {
    EXPECT_EQ(json_string("a \"b\" c:\\d /"), R"("a \"b\" c:\\d /")");
    EXPECT_EQ(json_string(std::string_view{"\0\n\x1F\x7F", 4}), "\"\\u0000\\u000a\\u001f\x7F\"");
    EXPECT_EQ(json_string("Gr\xC3\xBC\xFF"), "\"Gr\xC3\xBC\xEF\xBF\xBD\"");
}

TEST(ReadTextFile, DropsTheByteOrderMarkAndNamesWhatIsMissing) {
    const test::temporary_folder folder;
    test::write_file(folder / "a.txt", "\xEF\xBB\xBFhello");
    EXPECT_EQ(read_text_file(folder / "a.txt"), "hello");
    const auto missing = test::caught([&] { (void)read_text_file(folder / "b.txt"); });
    EXPECT_EQ(missing.kind, fault::unreadable);
    EXPECT_TRUE(missing.says("b.txt: cannot be read (No such file"));
    EXPECT_EQ(test::caught([&] { (void)read_text_file(folder.path()); }).kind, fault::unreadable);
}

TEST(Text, BreaksBetweenWords) {
    using lines = std::vector<std::string>;
    EXPECT_EQ(wrapped_lines("one two  three", 7), (lines{"one two", "three"}));
    EXPECT_EQ(wrapped_lines("one two three", 9, 3), (lines{"one two", "three"}));
    EXPECT_EQ(wrapped_lines("one two is it", 7, 2), (lines{"one two", "is it"}));
    EXPECT_EQ(wrapped_lines("one two is it", 7, 3), (lines{"one two", "is", "it"}));
    EXPECT_EQ(wrapped_lines("unbreakable it is", 5), (lines{"unbreakable", "it is"}));
    EXPECT_EQ(wrapped_lines("90\u00B0 is", 6), (lines{"90\u00B0 is"})); // characters, not bytes
    EXPECT_EQ(wrapped_lines("  ", 5), lines{});
}

} // namespace
