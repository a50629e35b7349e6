// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/report/json_report.hpp"

#include <fmt/format.h>
#include <nlohmann/json.hpp>

#include "report/sample_report.hpp"
#include "support/run_command.hpp"

namespace {

using namespace tonewalk;
using json = nlohmann::ordered_json;

json parsed(const sheet& result) {
    return json::parse(test::json_of(test::sample_context(), result));
}

TEST(JsonReport, HoldsEveryPartOfTheEnvelopeInOrder) {
    const auto document = json::parse(test::json_of(test::sample_context(), test::sample_result()));
    std::vector<std::string> keys;
    for (const auto& [key, value] : document.items())
        keys.push_back(key);
    EXPECT_EQ(keys,
              (std::vector<std::string>{"tonewalk", "command", "job", "recording", "signal", "kit",
                                        "result", "curves", "verdicts", "notes", "cautions"}));
    EXPECT_EQ(document["tonewalk"]["schema"], 1);
    EXPECT_EQ(document["recording"]["start_utc"], "2026-05-04T09:30:00.5Z");
    EXPECT_EQ(document["recording"]["sha512"], nullptr);
    EXPECT_EQ(document["kit"], nullptr);
    EXPECT_EQ(document["notes"][0]["code"], "weak-tone");
    EXPECT_FALSE(document["cautions"].empty());
}

TEST(JsonReport, WritesNumbersThatReadBackEqualAndNullForWhatWasNotMeasured) {
    const json log = parsed(test::sample_result())["result"]["log"];
    EXPECT_EQ(log["tone_dbfs"][2].get<double>(), -1.0 / 3.0);
    EXPECT_EQ(log["tone_dbfs"][1], nullptr);
    EXPECT_EQ(log["noise_dbfs_hz"][2], nullptr); // minus infinity
    sheet page;
    const std::vector<double> hard{5e-324, 1.7976931348623157e308, 0.1,
                                   1e23,   123456789012345680.0,   2e-6};
    for (std::size_t i = 0; i < hard.size(); ++i)
        page.add(fmt::format("n{}", i), "", cell{hard[i]});
    page.add("whole", "", cell{std::int64_t{9007199254740993}});
    const json result = parsed(page)["result"];
    for (std::size_t i = 0; i < hard.size(); ++i)
        EXPECT_EQ(result[fmt::format("n{}", i)].get<double>(), hard[i]);
    EXPECT_EQ(result["whole"].get<std::int64_t>(), 9007199254740993);
}

TEST(JsonReport, SetsTablesAsColumnsOrAsRecords) {
    const json result = parsed(test::sample_result())["result"];
    EXPECT_EQ(result["log"]["time_s"], (json{0.1, 0.2, 0.3}));
    EXPECT_EQ(result["log"]["flags"][1], "weak-tone floor-limited");
    EXPECT_EQ(result["extrema"][0]["kind"], "null");
    EXPECT_EQ(result["extrema"][0]["floor_limited"], true);
    EXPECT_EQ(result["summary"]["min_dbfs_high95"], -60.0);
}

TEST(JsonReport, ReplacesWhatIsNotUtf8AndEscapesControlCharacters) {
    report_context context = test::sample_context();
    context.recordings[0].name = "a\xFF\n\"b\"";
    const json document = json::parse(test::json_of(context, test::sample_result()));
    EXPECT_EQ(document["recording"]["name"], "a\xEF\xBF\xBD\n\"b\"");
}

TEST(JsonReport, LeavesCurvesOutWhenAskedAndKeepsThoseOfNestedParts) {
    EXPECT_FALSE(
        json::parse(test::json_of(test::sample_context(), test::sample_result(), {.curves = false}))
            .contains("curves"));
    sheet page = test::sample_result();
    sheet part;
    part.add(curve{"spectrum", "line", "Hz", "dBFS", "", {1.0}, {2.0}, {}});
    page.add("part", std::move(part));
    const json curves = parsed(page)["curves"];
    EXPECT_EQ(curves["spectrum"]["x"].size(), 3U);
    EXPECT_FALSE(curves["spectrum"].contains("z"));
    EXPECT_EQ(curves["strip"]["z"].size(), 4U);
    EXPECT_EQ(curves["spectrum_2"]["y"], (json{2.0}));
}

TEST(JsonReport, ListsRecordingsOnlyWhereThereAreSeveral) {
    report_context context = test::sample_context();
    EXPECT_FALSE(json::parse(test::json_of(context, {})).contains("recordings"));
    context.recordings.push_back(context.recordings[0]);
    context.signal.reset();
    const json document = json::parse(test::json_of(context, {}));
    EXPECT_EQ(document["recordings"].size(), 2U);
    EXPECT_EQ(document["signal"], nullptr);
    EXPECT_EQ(document["result"], json::object());
}

TEST(JsonReport, AsksEachCellOnceAndNeverHoldsTheLog) {
    std::size_t asked = 0;
    sheet_table log{"log", 100'000, {}, table_form::as_columns};
    log.columns.push_back({"time_s", "s", [&asked](std::size_t row) {
                               ++asked;
                               return cell{0.5 * static_cast<double>(row)};
                           }});
    sheet page;
    page.add(std::move(log));
    const std::string text = test::json_of(test::sample_context(), page);
    EXPECT_EQ(asked, 100'000U);
    std::size_t longest = 0;
    for (std::size_t start = 0; start < text.size();) {
        const std::size_t end = text.find('\n', start);
        if (text.compare(start, 6, "      ") == 0)
            longest = std::max(longest, end - start);
        start = end + 1;
    }
    EXPECT_LE(longest, 101U); // wrapped lists
    EXPECT_EQ(json::parse(text)["result"]["log"]["time_s"][99'999], 49'999.5);
}

TEST(RecordingSummary, CountsGapsInTheSpanAndOnlyMeasuredSamples) {
    stream_facts facts;
    facts.name = "a";
    facts.sample_rate_hz = 1000.0;
    facts.stretches = {{0, 500, 100, {}}, {500, 500, 2100, {}}};
    const recording_summary all = summarise(facts, 1000, false);
    EXPECT_EQ(all.duration_s, 1.0);
    EXPECT_EQ(all.span_s, 2.5); // 100 to 2600
    const recording_summary part = summarise(facts, 600, true);
    EXPECT_EQ(part.duration_s, 0.6);
    EXPECT_EQ(part.span_s, 2.1);
    EXPECT_EQ(summarise(facts, 400, true).span_s, 0.4);
    facts.stretches = {{0, std::nullopt, 0, {}}}; // a pipe
    EXPECT_EQ(summarise(facts, 700, false).span_s, 0.7);
}

TEST(ResultsSchema, KnowsEveryNoteCodeAndTheSchemaNumber) {
    const json schema =
        json::parse(test::read_file(TONEWALK_TEST_SUPPORT "/../../docs/results.schema.json"));
    std::vector<std::string> codes;
    for (int code = 0; code <= static_cast<int>(note_code::residual_too_large); ++code)
        codes.emplace_back(name(static_cast<note_code>(code)));
    EXPECT_EQ(schema["$defs"]["note"]["properties"]["code"]["enum"], json(codes));
    EXPECT_EQ(schema["properties"]["tonewalk"]["properties"]["schema"]["const"],
              json_schema_version);
}

// Outside truth: Python's own JSON reader and the schema that stands in docs.
TEST(OutsideJsonReport, IsReadByPythonAndKeepsToTheSchema) {
    const test::temporary_folder folder;
    test::write_file(folder / "result.json",
                     test::json_of(test::sample_context(), test::sample_result()));
    const auto read = test::run_command(
        fmt::format("{} -m json.tool {}", TONEWALK_TEST_PYTHON, (folder / "result.json").string()));
    EXPECT_EQ(read.status, 0) << read.output;
    const auto held = test::run_command(fmt::format(
        "{} {}/hold_against_schema.py {}/../../docs/results.schema.json {}", TONEWALK_TEST_PYTHON,
        TONEWALK_TEST_SUPPORT, TONEWALK_TEST_SUPPORT, (folder / "result.json").string()));
    EXPECT_EQ(held.status, 0) << held.output;
}

TEST(OutsideJsonReport, IsRefusedByTheSchemaWhenAFieldIsMissing) {
    const test::temporary_folder folder;
    sheet broken = test::sample_result();
    broken.items.erase(broken.items.begin()); // interval_s
    test::write_file(folder / "result.json", test::json_of(test::sample_context(), broken));
    const auto held = test::run_command(fmt::format(
        "{} {}/hold_against_schema.py {}/../../docs/results.schema.json {}", TONEWALK_TEST_PYTHON,
        TONEWALK_TEST_SUPPORT, TONEWALK_TEST_SUPPORT, (folder / "result.json").string()));
    EXPECT_EQ(held.status, 1);
    EXPECT_NE(held.output.find("interval_s"), held.output.npos) << held.output;
}

} // namespace
