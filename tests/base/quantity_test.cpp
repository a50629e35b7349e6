// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/base/quantity.hpp"

#include <locale>

#include "support/expect_error.hpp"

namespace {

using namespace tonewalk;
using test::caught;

TEST(ParseHz, ScalesByThePrefixRoundingOnce) {
    EXPECT_EQ(parse_hz("145.2M", "--carrier"), 145200000.0);
    EXPECT_EQ(parse_hz("12.5k", "--width"), 12500.0);
    EXPECT_EQ(parse_hz("1000", "--tone"), 1000.0);
    EXPECT_EQ(parse_hz("1k Hz", "--tone"), 1000.0);
    EXPECT_EQ(parse_hz("2.4MHz", "--rate"), 2400000.0);
    EXPECT_EQ(parse_hz(" 437.5 hz ", "--tone"), 437.5);
    EXPECT_EQ(parse_hz("1.0296G", "--centre"), 1029600000.0);
    EXPECT_EQ(parse_hz("1e6", "--rate"), 1e6);
    EXPECT_EQ(parse_hz("1.5e+3k", "--rate"), 1.5e6);
    EXPECT_EQ(parse_hz("433.92M", "--centre"),
              433920000.0); // 433.92 * 1e6 alone would miss by one unit
}

TEST(ParseHz, TellsOffsetsFromAbsoluteFrequenciesByTheSign) {
    EXPECT_TRUE(parse_signed_hz("+3.2M", "--carrier").is_offset);
    EXPECT_EQ(parse_signed_hz("+3.2M", "--carrier").hz, 3200000.0);
    EXPECT_TRUE(parse_signed_hz("-5k", "--carrier").is_offset);
    EXPECT_EQ(parse_signed_hz("-5k", "--carrier").hz, -5000.0);
    EXPECT_FALSE(parse_signed_hz("145M", "--carrier").is_offset);
    EXPECT_TRUE(parse_signed_hz("-0", "--carrier").is_offset);
}

TEST(ParseHz, RefusesInOneLineThatNamesOptionTypingAndExample) {
    const auto comma = caught([] { (void)parse_hz("12,5k", "--width"); });
    EXPECT_EQ(comma.kind, fault::bad_request);
    EXPECT_TRUE(comma.says("--width: \"12,5k\" is not a frequency; use a decimal point"))
        << comma.line;
    EXPECT_TRUE(comma.says("145.2M")) << comma.line;
    for (const char* text : {"", "k", "inf", "nan", "1e999", "0x10", "1m", "1 000", "+-3", "--3",
                             "1kk", "5s", "1e5e5", "1e", "infinity"})
        EXPECT_EQ(caught([&] { (void)parse_hz(text, "--rate"); }).kind, fault::bad_request) << text;
}

TEST(ParseSeconds, TakesUnitsAndClockTimes) {
    EXPECT_EQ(parse_seconds("1.5", "--from"), 1.5);
    EXPECT_EQ(parse_seconds("1.5s", "--from"), 1.5);
    EXPECT_EQ(parse_seconds("200ms", "--window"), 0.2);
    EXPECT_EQ(parse_seconds("250us", "--window"), 0.00025);
    EXPECT_EQ(parse_seconds("3min", "--from"), 180.0);
    EXPECT_EQ(parse_seconds("2 h", "--from"), 7200.0);
    EXPECT_EQ(parse_seconds("01:02:03.5", "--from"), 3723.5);
    EXPECT_EQ(parse_seconds("02:03", "--from"), 123.0);
    EXPECT_EQ(parse_seconds("100:00", "--from"), 6000.0);
    EXPECT_EQ(parse_seconds("-0.5", "--track-shift"), -0.5);
}

TEST(ParseSeconds, RefusesABareMByName) {
    const auto metres = caught([] { (void)parse_seconds("3m", "--from"); });
    EXPECT_EQ(metres.kind, fault::bad_request);
    EXPECT_TRUE(metres.says("metres or minutes")) << metres.line;
    for (const char* text : {"", "1:60", "1:2:3:4", "-1:00", "1:-1", "1.5:00", "1e1:00", ":30",
                             "30:", "5k", "1,5", "inf"})
        EXPECT_EQ(caught([&] { (void)parse_seconds(text, "--from"); }).kind, fault::bad_request)
            << text;
}

TEST(ParseMoment, IsSecondsOrADate) {
    EXPECT_EQ(std::get<double>(parse_moment("12.5", "--from")), 12.5);
    EXPECT_EQ(std::get<utc_time>(parse_moment("2026-05-04T09:30:00Z", "--from")),
              *parse_utc("2026-05-04T09:30:00Z"));
    EXPECT_TRUE(caught([] { (void)parse_moment("2026-05-04T09:30:00", "--from"); }).says("zone"));
    EXPECT_EQ(caught([] { (void)parse_moment("noon", "--from"); }).kind, fault::bad_request);
}

TEST(ParseDb, TakesThePlainNumberOrWithItsUnit) {
    EXPECT_EQ(parse_db("-3", "--gain"), -3.0);
    EXPECT_EQ(parse_db("+6.5dB", "--gain"), 6.5);
    EXPECT_EQ(parse_db("6 db", "--gain"), 6.0);
    EXPECT_EQ(caught([] { (void)parse_db("6dBm", "--gain"); }).kind, fault::bad_request);
    EXPECT_EQ(caught([] { (void)parse_db("-inf", "--gain"); }).kind, fault::bad_request);
}

TEST(ParseWhole, KeepsToItsRange) {
    EXPECT_EQ(parse_whole("4", "--threads", 1, 64), 4);
    EXPECT_EQ(parse_whole("+64", "--threads", 1, 64), 64);
    EXPECT_TRUE(caught([] { (void)parse_whole("0", "--threads", 1, 64); }).says("from 1 to 64"));
    EXPECT_TRUE(caught([] {
                    (void)parse_whole("99999999999999999999", "--lane", 0, 7);
                }).says("from 0 to 7"));
    for (const char* text : {"", "1.5", "two", "4x", "+-4"})
        EXPECT_EQ(caught([&] { (void)parse_whole(text, "--threads", 1, 64); }).kind,
                  fault::bad_request)
            << text;
}

TEST(FormatHz, UsesEngineeringPrefixesWithoutTrailingZeros) {
    EXPECT_EQ(format_hz(145200000.0), "145.2 MHz");
    EXPECT_EQ(format_hz(1000.0), "1 kHz");
    EXPECT_EQ(format_hz(437.5), "437.5 Hz");
    EXPECT_EQ(format_hz(-12500.0), "-12.5 kHz");
    EXPECT_EQ(format_hz(0.0), "0 Hz");
    EXPECT_EQ(format_hz(999.9999, 4), "1 kHz");
    EXPECT_EQ(format_hz(1029600012.5, 6), "1.0296 GHz");
    EXPECT_EQ(format_hz(145.0, 1), "145 Hz");
}

TEST(FormatOptionHz, GivesTheShortestTypingThatReadsBackEqual) {
    EXPECT_EQ(format_option_hz(3200000.0, true), "+3.2M");
    EXPECT_EQ(format_option_hz(-12500.0, true), "-12.5k");
    EXPECT_EQ(format_option_hz(145200000.0, false), "145.2M");
    for (const double hz :
         {1.0, 1029.3333333333333, 433920000.0, 123456789.125, 8333.333333333334, 1e9, 0.0}) {
        EXPECT_EQ(parse_hz(format_option_hz(hz, false), "--carrier"), hz);
        EXPECT_EQ(parse_signed_hz(format_option_hz(-hz, true), "--carrier").hz, -hz);
    }
}

TEST(Quantities, TellTimesAsPeopleTypeThem) {
    EXPECT_EQ(format_option_seconds(0.2), "200ms");
    EXPECT_EQ(format_option_seconds(0.001), "1ms");
    EXPECT_EQ(format_option_seconds(0.0041), "4.1ms");
    EXPECT_EQ(format_option_seconds(1.0), "1s");
    EXPECT_EQ(format_option_seconds(90.5), "90.5s");
    for (const double seconds : {0.2, 0.0041, 1e-6, 3600.0, 1.25}) {
        EXPECT_DOUBLE_EQ(parse_seconds(format_option_seconds(seconds), "--window"), seconds);
    }
}

/// Numbers as written where the decimal separator is a comma.
class comma_numbers : public std::numpunct<char> {
    char do_decimal_point() const override { return ','; }
    char do_thousands_sep() const override { return '.'; }
    std::string do_grouping() const override { return "\3"; }
};

TEST(Quantities, IgnoreTheLocalesDecimalComma) {
    const std::locale before = std::locale::global({std::locale{}, new comma_numbers});
    EXPECT_EQ(parse_hz("12.5k", "--width"), 12500.0);
    EXPECT_EQ(format_hz(145200000.0), "145.2 MHz");
    EXPECT_EQ(format_option_hz(123456.5, true), "+123456.5");
    EXPECT_TRUE(caught([] { (void)parse_whole("1000", "--lane", 0, 7777); }).line.empty());
    std::locale::global(before);
}

} // namespace
