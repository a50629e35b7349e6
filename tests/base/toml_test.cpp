// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/base/toml.hpp"

#include "support/expect_error.hpp"
#include "support/temporary_folder.hpp"

namespace {

using namespace tonewalk;
using test::caught;

constexpr std::string_view scene = R"(# a scene
[recording]
rate_hz = 2.4e6
duration_s = 10
seed = 7
format = "ci16_le"
start_utc = 2026-05-04T09:30:00.5Z
swap = false

[[carrier]]
offset_hz = 3200000
[[carrier.tone]]
frequency_hz = 1000.0
[[carrier.tone]]
frequency_hz = 400.0
[[carrier]]
offset_hz = -1e5
points = [0, 1.5, 2]
)";

TEST(TomlTable, GivesTypedValuesAndNothingForAbsentKeys) {
    const toml_table root = parse_toml(scene, "scene.toml");
    const toml_table recording = root.need_table("recording");
    EXPECT_EQ(recording.number("rate_hz"), 2.4e6);
    EXPECT_EQ(recording.number("duration_s"), 10.0); // whole numbers are numbers
    EXPECT_EQ(recording.whole("seed"), 7);
    EXPECT_EQ(recording.text("format"), "ci16_le");
    EXPECT_EQ(recording.utc("start_utc"), parse_utc("2026-05-04T09:30:00.5Z"));
    EXPECT_EQ(recording.yes_no("swap"), false);
    EXPECT_FALSE(recording.number("centre_hz").has_value());
    const auto carriers = root.tables("carrier");
    ASSERT_EQ(carriers.size(), 2U);
    const auto tones = carriers[0].tables("tone");
    ASSERT_EQ(tones.size(), 2U);
    EXPECT_EQ(tones[1].number("frequency_hz"), 400.0);
    EXPECT_EQ(carriers[1].number("offset_hz"), -1e5);
    EXPECT_EQ(carriers[1].numbers("points"), (std::vector<double>{0.0, 1.5, 2.0}));
    EXPECT_TRUE(root.tables("path").empty());
    EXPECT_EQ(recording.keys().front(), "rate_hz"); // in file order
}

TEST(TomlTable, RefusesKeysThatNobodyAskedForWithAHint) {
    const toml_table root =
        parse_toml("[receiver]\nfull_scale_dbm = -10.0\n\nu95_bd = 0.5\n", "kit.toml");
    const toml_table receiver = root.need_table("receiver");
    EXPECT_EQ(receiver.number("full_scale_dbm"), -10.0);
    EXPECT_FALSE(receiver.number("u95_db").has_value());
    const auto refused = caught([&] { root.finish(); });
    EXPECT_EQ(refused.kind, fault::malformed);
    EXPECT_EQ(refused.exit_status, 3);
    EXPECT_EQ(refused.line,
              "kit.toml, line 4, receiver.u95_bd: is not known here; did you mean u95_db?");
}

TEST(TomlTable, FinishesQuietlyWhenEveryKeyWasAskedFor) {
    const toml_table root = parse_toml("a = 1\n[[b]]\nc = 2\n[[b]]\nc = 3\n", "x.toml");
    EXPECT_EQ(root.whole("a"), 1);
    for (const toml_table& each : root.tables("b"))
        EXPECT_TRUE(each.whole("c").has_value());
    EXPECT_NO_THROW(root.finish());
}

TEST(TomlTable, NamesLineAndKeyOfAValueOfAnotherType) {
    const toml_table root =
        parse_toml("[recording]\nrate_hz = \"2.4M\"\nseed = 1.5\n", "scene.toml");
    const toml_table recording = root.need_table("recording");
    EXPECT_EQ(
        caught([&] { (void)recording.number("rate_hz"); }).line,
        "scene.toml, line 2, recording.rate_hz: is not a number; write it like rate_hz = 1.5");
    EXPECT_TRUE(caught([&] { (void)recording.whole("seed"); }).says("line 3, recording.seed"));
    EXPECT_TRUE(caught([&] { (void)recording.text("seed"); }).says("is not text"));
    EXPECT_TRUE(caught([&] { (void)recording.table("seed"); }).says("is not a table"));
    EXPECT_TRUE(caught([&] { (void)recording.tables("seed"); }).says("is not a list of tables"));
    EXPECT_TRUE(caught([&] { (void)recording.utc("rate_hz"); }).says("is not a date and time"));
}

TEST(TomlTable, NamesTheNestedTableThatLacksAKey) {
    const toml_table root =
        parse_toml("\n[[carrier]]\n[[carrier.tone]]\ndepth_percent = 30\n", "scene.toml");
    const toml_table tone = root.tables("carrier")[0].tables("tone")[0];
    const auto missing = caught([&] { (void)tone.need_number("frequency_hz", "1000.0"); });
    EXPECT_EQ(missing.line, "scene.toml, line 3, carrier[0].tone[0].frequency_hz: is missing; "
                            "add frequency_hz = 1000.0");
    EXPECT_EQ(tone.wrong("depth_percent", "is above 100", "lower it").exit_status(), 3);
    EXPECT_STREQ(tone.wrong("depth_percent", "is above 100", "lower it").what(),
                 "scene.toml, line 4, carrier[0].tone[0].depth_percent: is above 100; lower it");
}

TEST(MalformedToml, IsRefusedWithItsLine) {
    EXPECT_TRUE(
        caught([] { (void)parse_toml("a = 1\nb = = 2\n", "x.toml"); }).says("x.toml, line 2"));
    EXPECT_TRUE(
        caught([] { (void)parse_toml("a = 1\na = 2\n", "x.toml"); }).says("x.toml, line 2"));
    for (const char* number : {"inf", "-inf", "nan"})
        EXPECT_TRUE(caught([&] {
                        (void)parse_toml(std::string{"\na = "} + number, "x.toml");
                    }).says("x.toml, line 2, a: is not a finite number"));
    EXPECT_EQ(caught([] { (void)read_toml("/nonexistent/x.toml"); }).kind, fault::unreadable);
}

} // namespace
