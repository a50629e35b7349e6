// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/recording/sigmf_metadata.hpp"

#include <gtest/gtest.h>

#include "support/expect_error.hpp"

namespace tonewalk {
namespace {

// Metadata with these members added to global, and these captures.
std::string metadata_text(const std::string& global, const std::string& captures = "[]") {
    return R"({"global": {"core:datatype": "cu8", "core:version": "1.2.5")" +
           (global.empty() ? "" : ", " + global) + R"(}, "captures": )" + captures +
           R"(, "annotations": []})";
}

TEST(SigmfMetadata, ReadsEveryFieldThatPlacesSamples) {
    const auto read = parse_sigmf_metadata(
        metadata_text(R"("core:sample_rate": 2400000.5, "core:num_channels": 3, "core:offset": 100,
            "core:sha512": ")" +
                          std::string(128, 'F') +
                          R"(", "core:dataset": "a b.bin", "core:trailing_bytes": 7,
            "core:metadata_only": true, "core:extensions":
            [{"name": "antenna", "version": "1.0.0", "optional": true}], "other:thing": [1, null])",
                      R"([{"core:sample_start": 100, "core:frequency": -1e6, "other:x": 1},
            {"core:sample_start": 200.0, "core:global_index": 300, "core:header_bytes": 4,
             "core:datetime": "2021-06-18T23:17:51.163959Z"}])"),
        "x");
    EXPECT_EQ(read.format->name(), "cu8");
    EXPECT_EQ(read.sample_rate_hz, 2400000.5);
    EXPECT_EQ(read.lanes, 3U);
    EXPECT_EQ(read.offset, 100);
    EXPECT_EQ(read.sha512, std::string(128, 'f'));
    EXPECT_EQ(read.dataset, "a b.bin");
    EXPECT_EQ(read.trailing_bytes, 7);
    EXPECT_TRUE(read.metadata_only);
    ASSERT_EQ(read.captures.size(), 2U);
    EXPECT_EQ(read.captures[0].centre_hz, -1e6);
    EXPECT_FALSE(read.captures[0].global_index);
    EXPECT_EQ(read.captures[1].sample_start, 200);
    EXPECT_EQ(read.captures[1].global_index, 300);
    EXPECT_EQ(read.captures[1].header_bytes, 4);
    EXPECT_EQ(read.captures[1].utc_decimals, 6U);
    EXPECT_FALSE(read.captures[1].centre_hz) << "values do not carry over (SIG-8)";
}

// Each row: what is wrong, and what the one line must name.
struct wrong_metadata {
    std::string text;
    const char* place;
    const char* what;
};

void expect_refused(const wrong_metadata& row) {
    const auto failure =
        test::caught([&] { (void)parse_sigmf_metadata(row.text, "bad.sigmf-meta"); });
    ASSERT_TRUE(failure.kind.has_value()) << row.text;
    EXPECT_EQ(failure.exit_status, 3) << row.text;
    EXPECT_EQ(failure.line.find("bad.sigmf-meta"), 0U) << failure.line;
    EXPECT_TRUE(failure.says(row.place)) << failure.line;
    EXPECT_TRUE(failure.says(row.what)) << failure.line;
    EXPECT_FALSE(failure.says("\n")) << failure.line;
    EXPECT_TRUE(failure.says("; ")) << "no mend: " << failure.line;
}

TEST(MalformedMetadata, TextThatIsNoJsonNamesTheByte) {
    for (const std::string text : {"", "{", "[1, 2", "\x80{}", "{\"global\": {\"a\": \x01}}",
                                   "not json", "{\"a\": 1} trailing", "{\"a\": \"\xE9\"}"})
        expect_refused({text, "byte ", "is no valid JSON"});
    expect_refused({R"({"a": 1e999})", "", "beyond all range"});
    expect_refused({std::string(100000, '['), "byte ", "is no valid JSON"});
    expect_refused({"\xFF\xFE{", "bad.sigmf-meta", "UTF-16"});
}

TEST(MalformedMetadata, DeepNestingIsRefusedOrReadWithoutExhaustingTheStack) {
    const std::string deep = std::string(200000, '[') + std::string(200000, ']');
    const auto read = parse_sigmf_metadata(metadata_text("\"other:deep\": " + deep), "x");
    EXPECT_EQ(read.datatype, "cu8");
}

TEST(MalformedMetadata, MissingPartsAreNamed) {
    const wrong_metadata rows[] = {
        {"[]", "", "must be an object"},
        {"3", "", "must be an object"},
        {R"({"captures": [], "annotations": []})", "global", "is missing"},
        {R"({"global": [], "captures": [], "annotations": []})", "global", "must be an object"},
        {R"({"global": {"core:datatype": "cu8", "core:version": "1.0.0"}, "annotations": []})",
         "captures", "is missing"},
        {R"({"global": {"core:datatype": "cu8", "core:version": "1.0.0"}, "captures": []})",
         "annotations", "is missing"},
        {R"({"global": {"core:version": "1.0.0"}, "captures": [], "annotations": []})",
         "core:datatype", "is missing"},
        {R"({"global": {"core:datatype": "cu8"}, "captures": [], "annotations": []})",
         "core:version", "is missing"},
        {metadata_text("", "[{}]"), "captures[0], core:sample_start", "is missing"},
    };
    for (const auto& row : rows)
        expect_refused(row);
}

TEST(MalformedMetadata, WrongTypesAndValuesNameTheField) {
    const wrong_metadata rows[] = {
        {R"({"global": {"core:datatype": 5, "core:version": "1.0.0"}, "captures": [],
            "annotations": []})",
         "core:datatype", "must be a text"},
        {R"({"global": {"core:datatype": "cu8", "core:version": "one"}, "captures": [],
            "annotations": []})",
         "core:version", "\"one\""},
        {R"({"global": {"core:datatype": "cu8", "core:version": "2.0.0"}, "captures": [],
            "annotations": []})",
         "core:version", "newer"},
        {metadata_text(R"("core:sample_rate": "48k")"), "core:sample_rate", "must be a number"},
        {metadata_text(R"("core:sample_rate": 0)"), "core:sample_rate", "must lie from 1"},
        {metadata_text(R"("core:sample_rate": -48000)"), "core:sample_rate", "must lie from 1"},
        {metadata_text(R"("core:sample_rate": 1e13)"), "core:sample_rate", "must lie from 1"},
        {metadata_text(R"("core:sample_rate": null)"), "core:sample_rate", "must be a number"},
        {metadata_text(R"("core:num_channels": 0)"), "core:num_channels", "must lie from 1"},
        {metadata_text(R"("core:num_channels": 1.5)"), "core:num_channels", "whole number"},
        {metadata_text(R"("core:num_channels": 4294967297)"), "core:num_channels", "must lie"},
        {metadata_text(R"("core:num_channels": 18446744073709551615)"), "core:num_channels",
         "must lie"},
        {metadata_text(R"("core:num_channels": true)"), "core:num_channels", "must be a number"},
        {metadata_text(R"("core:offset": -1)"), "core:offset", "must lie"},
        {metadata_text(R"("core:trailing_bytes": -4)"), "core:trailing_bytes", "must lie"},
        {metadata_text(R"("core:sha512": "abc")"), "core:sha512", "128 hex digits"},
        {metadata_text(R"("core:sha512": 12)"), "core:sha512", "must be a text"},
        {metadata_text(R"("core:dataset": "../x.bin")"), "core:dataset", "same folder"},
        {metadata_text(R"("core:dataset": "/etc/x")"), "core:dataset", "same folder"},
        {metadata_text(R"("core:dataset": "")"), "core:dataset", "same folder"},
        {metadata_text(R"("core:metadata_only": "yes")"), "core:metadata_only", "true or false"},
    };
    for (const auto& row : rows)
        expect_refused(row);
}

TEST(MalformedMetadata, WrongCapturesNameTheEntry) {
    const wrong_metadata rows[] = {
        {metadata_text("", "{}"), "captures", "must be an array"},
        {metadata_text("", "[5]"), "captures[0]", "must be an object"},
        {metadata_text("", R"([{"core:sample_start": -1}])"), "captures[0], core:sample_start",
         "must lie"},
        {metadata_text("", R"([{"core:sample_start": 1e300}])"), "captures[0], core:sample_start",
         "must lie"},
        {metadata_text("", R"([{"core:sample_start": 9223372036854775807}])"),
         "captures[0], core:sample_start", "must lie"},
        {metadata_text("", R"([{"core:sample_start": 5}, {"core:sample_start": 4}])"),
         "captures[1], core:sample_start", "is lower"},
        {metadata_text(R"("core:offset": 10)", R"([{"core:sample_start": 5}])"),
         "captures[0], core:sample_start", "core:offset"},
        {metadata_text("", R"([{"core:sample_start": 0, "core:frequency": 1e13}])"),
         "core:frequency", "must lie"},
        {metadata_text("", R"([{"core:sample_start": 0, "core:header_bytes": "4"}])"),
         "core:header_bytes", "must be a number"},
        {metadata_text("", R"([{"core:sample_start": 0, "core:datetime": "yesterday\n"}])"),
         "core:datetime", "must read like"},
        {metadata_text("", R"([{"core:sample_start": 0, "core:datetime": 5}])"), "core:datetime",
         "must be a text"},
    };
    for (const auto& row : rows)
        expect_refused(row);
}

TEST(MalformedMetadata, AFieldGivenTwiceIsRefused) {
    expect_refused({metadata_text(R"("core:sample_rate": 1000, "core:sample_rate": 2000)"),
                    "bad.sigmf-meta", "\"core:sample_rate\" stands twice"});
    // The same name in two objects is no duplicate.
    EXPECT_NO_THROW((void)parse_sigmf_metadata(
        metadata_text("", R"([{"core:sample_start": 0}, {"core:sample_start": 1}])"), "x"));
}

// SIG-7: an extension with optional = false that is unsupported is an error.
TEST(MalformedMetadata, ExtensionsThatMustBeUnderstoodAreRefusedByName) {
    const auto with = [](const std::string& extensions) {
        return metadata_text(R"("core:extensions": )" + extensions);
    };
    expect_refused({with(R"([{"name": "spatial", "version": "1.1.0", "optional": false}])"),
                    "core:extensions[0]", "\"spatial\" must be understood"});
    expect_refused({with(R"([{"name": "x", "version": "1.0.0"}])"), "core:extensions[0], optional",
                    "is missing"});
    expect_refused({with(R"({"x": "1.0.0"})"), "core:extensions", "must be an array"});
    expect_refused({with(R"(["x"])"), "core:extensions[0]", "must be an object"});
    expect_refused({with(R"([{"name": 3, "version": "1.0.0", "optional": true}])"),
                    "core:extensions[0], name", "must be a text"});
}

} // namespace
} // namespace tonewalk
