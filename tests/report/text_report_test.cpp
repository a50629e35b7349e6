// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/report/text_report.hpp"

#include <algorithm>
#include <sstream>

#include "report/sample_report.hpp"

namespace {

using namespace tonewalk;

std::string summary_of(const sheet& result, int columns = 80) {
    return summary_text(test::sample_context(), result,
                        {.columns = columns, .plot_column = "tone_dbfs"});
}

std::string shown(double value, double u95) {
    sheet page;
    page.add("depth_percent", "%", estimate{value, u95});
    report_context bare;
    const std::string text = summary_text(bare, page, {});
    return text.substr(text.find("depth  ") + 7, text.rfind('\n') - text.find("depth  ") - 7);
}

// Two significant digits of the uncertainty, the value to the same place: JCGM 100 (GUM) 7.2.6.
TEST(TextReport, RoundsTheUncertaintyToTwoDigitsAndTheValueToTheSamePlace) {
    EXPECT_EQ(shown(30.123456, 0.01234), "30.123 +/- 0.012 %");
    EXPECT_EQ(shown(30.123456, 0.0996), "30.12 +/- 0.10 %");
    EXPECT_EQ(shown(30.123456, 1.0), "30.1 +/- 1.0 %");
    EXPECT_EQ(shown(30.123456, 12.6), "30 +/- 13 %");
    EXPECT_EQ(shown(1234.5, 126.0), "1230 +/- 130 %");
    EXPECT_EQ(shown(-0.0004, 0.12), "0.00 +/- 0.12 %");
    EXPECT_EQ(shown(30.123456, not_measured), "30.12 %");
    EXPECT_EQ(shown(not_measured, not_measured), "not measured");
}

TEST(TextReport, ShowsIntervalsThatAreNotSymmetricAndBounds) {
    sheet page;
    page.add("max_dbfs", "dBFS", interval_estimate{-23.41, -25.13, -22.04, not_measured});
    page.add("min_dbfs", "dBFS",
             interval_estimate{not_measured, not_measured, -80.236, not_measured});
    page.add("detector", "", cell{});
    const std::string text = summary_text({}, page, {});
    EXPECT_NE(text.find("max       -23.4 (-25.1 to -22.0) dBFS\n"), text.npos) << text;
    EXPECT_NE(text.find("min       below -80.24 dBFS\n"), text.npos) << text;
    EXPECT_NE(text.find("detector  -\n"), text.npos) << text;
}

TEST(TextReport, ShowsNearlySymmetricIntervalsShortAndNoDecibelsBeyondThousandths) {
    sheet page;
    page.add("max_dbfs", "dBFS", interval_estimate{-21.44628, -21.44686, -21.44570, not_measured});
    page.add("carrier_hz", "Hz", cell{433919999.9876});
    page.add("channel_width_hz", "Hz", cell{5999.99996});
    const std::string text = summary_text({}, page, {});
    EXPECT_NE(text.find("max            -21.446 +/- 0.001 dBFS\n"), text.npos) << text;
    EXPECT_NE(text.find("carrier        433.92 MHz\n"), text.npos) << text;
    EXPECT_NE(text.find("channel width  6 kHz\n"), text.npos) << text;
}

TEST(TextReport, LetsABoundStandInForAValueThatIsOnlyBounded) {
    const auto swing = [](double value, double at_least) {
        sheet page;
        page.add("swing_db", "dB", cell{value}).add("swing_at_least", "dB", cell{at_least});
        return summary_text({}, page, {});
    };
    EXPECT_EQ(swing(18.06, not_measured), "\nswing  18.06 dB\n");
    EXPECT_EQ(swing(not_measured, 12.97), "\nswing  at least 12.97 dB\n");
}

TEST(TextReport, SaysWhatWasMeasuredAndDrawsTheLog) {
    const std::string text = summary_of(test::sample_result());
    for (const char* part :
         {"w\xC3\xA4lk.iq\n", "ci16_le, 2.4 MS/s, centre 145 MHz, from 2026-05-04T09:30:00Z, 1 s",
          "carrier         145.0010005 MHz", "tone            1 kHz", "summary", "extrema",
          "below -60.00", "tone (dBFS)\n", "v at most"})
        EXPECT_NE(text.find(part), text.npos) << part << "\n" << text;
}

TEST(TextReport, FitsAPhoneAndAWideScreen) {
    for (const int columns : {40, 60, 80, 120}) {
        std::istringstream lines{summary_of(test::sample_result(), columns) +
                                 notes_text(test::sample_context().notes, {.columns = columns}) +
                                 cautions_text(general_cautions(), {.columns = columns})};
        for (std::string line; std::getline(lines, line);)
            EXPECT_LE(line.size(), static_cast<std::size_t>(columns) + 1)
                << line; // one letter is two bytes
    }
}

TEST(TextReport, CutsLongTablesAndSaysSo) {
    sheet page;
    page.add(sheet_table{
        "extrema",
        50,
        {{"time_s", "s", [](std::size_t row) { return cell{static_cast<double>(row)}; }}},
        table_form::as_records});
    const std::string text = summary_text({}, page, {.table_rows = 20});
    EXPECT_NE(text.find("and 30 more\n"), text.npos) << text;
    EXPECT_NE(text.find("19"), text.npos);
    EXPECT_EQ(text.find("20\n"), text.npos);
}

TEST(TextReport, DisarmsControlCharactersOfForeignText) {
    report_context context = test::sample_context();
    context.recordings[0].name = "a\x1B]0;title\x07.iq";
    const std::string text = summary_text(context, {}, {});
    EXPECT_EQ(text.find('\x1B'), text.npos);
    EXPECT_NE(text.find("a?]0;title?.iq"), text.npos);
}

TEST(NotesText, HidesInfoWhenAskedButNeverWarnings) {
    note_set notes;
    notes.add({note_code::centre_unknown, severity::info, "no centre", "add --centre"});
    notes.add({note_code::weak_tone, severity::warning, "seen in half", "go closer"});
    EXPECT_EQ(notes_text(notes, {}), "info centre-unknown: no centre; add --centre\n"
                                     "warning weak-tone: seen in half; go closer\n");
    EXPECT_EQ(notes_text(notes, {.info_notes = false}),
              "warning weak-tone: seen in half; go closer\n");
    EXPECT_EQ(notes_text(notes, {.colour = true, .info_notes = false}),
              "\x1B[33mwarning weak-tone: seen in half; go closer\n\x1B[0m");
}

} // namespace
