// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/report/level_plot.hpp"

#include <algorithm>
#include <cmath>
#include <sstream>

#include "tonewalk/base/estimate.hpp"

namespace {

using namespace tonewalk;

level_plot ramp(std::size_t records, double from_db, double to_db) {
    level_plot plot;
    plot.title = "tone (dBFS)";
    for (std::size_t i = 0; i < records; ++i) {
        plot.time_s.push_back(0.1 * static_cast<double>(i + 1));
        plot.level.push_back(from_db +
                             (to_db - from_db) * static_cast<double>(i) /
                                 static_cast<double>(std::max<std::size_t>(records - 1, 1)));
        plot.bound.push_back(not_measured);
    }
    return plot;
}

std::vector<std::string> lines_of(const std::string& text) {
    std::vector<std::string> lines;
    std::istringstream in{text};
    for (std::string line; std::getline(in, line);)
        lines.push_back(line);
    return lines;
}

TEST(LevelPlot, DrawsARampAsADiagonal) {
    // 17 columns from -30 to -14 dB: a step of 5 dB takes 3 rows, so that half a row is 0.83 dB.
    EXPECT_EQ(draw(ramp(17, -30.0, -14.0), 24), R"(tone (dBFS)
  -10 |
      |
      |
  -15 |               .'
      |             .'
      |            .'
  -20 |          .'
      |        .'
      |       .'
  -25 |     .'
      |   .'
      |  .'
  -30 |.'
      +-----------------
       0.1 s       1.7 s
)");
}

TEST(LevelPlot, FitsEveryWidthWithAsciiAlone) {
    for (const int columns : {40, 61, 80, 120})
        for (const std::size_t records : {1U, 7U, 600U, 40'000U})
            for (const std::string& line : lines_of(draw(ramp(records, -90.0, 0.0), columns))) {
                EXPECT_LE(line.size(), static_cast<std::size_t>(columns));
                EXPECT_TRUE(std::all_of(line.begin(), line.end(),
                                        [](char c) { return c >= ' ' && c <= '~'; }));
            }
}

TEST(LevelPlot, ShowsANullOfOneRecordAmongThousands) {
    level_plot plot = ramp(10'000, -20.0, -20.0);
    plot.level[5000] = -60.0;
    const auto lines = lines_of(draw(plot, 80));
    const auto bottom = std::find_if(lines.begin(), lines.end(), [](const std::string& line) {
        return line.rfind("  -60 |", 0) == 0;
    });
    ASSERT_NE(bottom, lines.end());
    EXPECT_EQ(bottom->find_first_of(".:'", 7), 7U + 36U); // the middle of 73 columns
}

TEST(LevelPlot, MarksPeaksAboveNullsBelowAndBoundsWithV) {
    level_plot plot = ramp(17, -30.0, -14.0);
    plot.level[0] = not_measured;
    plot.bound[0] = -28.0;
    plot.marks = {{0.1, 'N'}, {1.7, 'P'}};
    const std::string text = draw(plot, 24);
    const auto lines = lines_of(text);
    const auto row_of = [&](char letter) {
        return std::find_if(lines.begin(), lines.end(), [letter](const std::string& line) {
            return line.find(letter, 7) != line.npos && line.find('|') == 6;
        });
    };
    ASSERT_NE(row_of('v'), lines.end()) << text;
    EXPECT_EQ(row_of('v')->find('v'), 7U);
    EXPECT_EQ(row_of('N') - row_of('v'), 1) << text; // right below
    EXPECT_EQ(row_of('P')->find('P'), 23U);
    EXPECT_EQ((row_of('P') + 1)->find_first_of(".:'", 23), 23U) << text;
    EXPECT_NE(text.find("P peak  N null  v at most"), text.npos);
}

TEST(LevelPlot, BreaksTheAxisWhereThereAreNoRecords) {
    level_plot plot = ramp(100, -20.0, -10.0);
    for (std::size_t i = 50; i < 100; ++i)
        plot.time_s[i] += 10.0;
    const auto lines = lines_of(draw(plot, 47)); // 40 columns for 20 s
    const auto axis = std::find_if(lines.begin(), lines.end(),
                                   [](const std::string& line) { return line.find('+') == 6; });
    ASSERT_NE(axis, lines.end());
    EXPECT_EQ(std::count(axis->begin() + 7, axis->end(), ' '), 20);
}

TEST(LevelPlot, DoesNotBlowUpTheNoiseOfASteadyCarrier) {
    level_plot plot = ramp(60, -20.0, -20.0);
    for (std::size_t i = 0; i < 60; i += 2)
        plot.level[i] += 0.01;
    for (const std::string& line : lines_of(draw(plot, 67))) {
        const auto marks = std::count_if(line.begin(), line.end(),
                                         [](char c) { return c == '.' || c == ':' || c == '\''; });
        EXPECT_TRUE(marks <= 1 || marks == 60 || line.find(" s") != line.npos) << line;
    }
}

TEST(LevelPlot, IsEmptyWhereNothingIsKnown) {
    EXPECT_EQ(draw({}, 80), "");
    level_plot plot = ramp(3, -20.0, -20.0);
    plot.level.assign(3, not_measured);
    EXPECT_EQ(draw(plot, 80), "");
}

} // namespace
