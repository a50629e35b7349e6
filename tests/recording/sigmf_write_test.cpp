// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/recording/sigmf_write.hpp"

#include <gtest/gtest.h>

#include "recording_support.hpp"
#include "tonewalk/recording/sigmf_metadata.hpp"

namespace tonewalk {
namespace {

using test::run_python;
using test::temporary_folder;
using test::write_file;

sigmf_document full_document() {
    sigmf_document document;
    document.format = parse_sample_format("ci16_le").value();
    document.sample_rate_hz = 2.4e6;
    document.author = "A. N. Operator";
    document.description = "two \"quoted\"\nlines";
    document.sha512 = std::string(128, 'a');
    document.segments = {
        {0, 0, 145.2e6, parse_utc("2026-05-04T09:30:00.125Z")},
        {500, 1000, 145.3e6, std::nullopt},
    };
    document.annotations = {{10, 20, sigmf_frequency_span{145e6, 145.1e6}, "carrier", "test tone"},
                            {30, std::nullopt, std::nullopt, "", "no end"}};
    return document;
}

// SIG-2, SIG-5 to SIG-8, SIG-11: the rules of SigMF 1.2.5, held by another JSON reader.
TEST(SigmfText, KeepsTheRulesOfTheSpecification) {
    const temporary_folder folder;
    write_file(folder / "x.sigmf-meta", sigmf_text(full_document()));
    run_python(folder.path(), R"(
m = json.load(open('x.sigmf-meta', encoding='utf-8'))
assert list(m) == ['global', 'captures', 'annotations'], m
g = m['global']
assert g['core:datatype'] == 'ci16_le' and g['core:version'] == '1.2.5', g
assert g['core:sample_rate'] == 2400000 and g['core:sha512'] == 'a' * 128, g
assert g['core:author'] == 'A. N. Operator' and g['core:description'] == 'two "quoted"\nlines', g
assert 'core:num_channels' not in g and 'core:license' not in g, g
assert m['captures'] == [
    {'core:sample_start': 0, 'core:global_index': 0, 'core:frequency': 145200000,
     'core:datetime': '2026-05-04T09:30:00.125Z'},
    {'core:sample_start': 500, 'core:global_index': 1000, 'core:frequency': 145300000}], m
assert m['annotations'] == [
    {'core:sample_start': 10, 'core:sample_count': 20, 'core:freq_lower_edge': 145000000,
     'core:freq_upper_edge': 145100000, 'core:label': 'carrier', 'core:comment': 'test tone'},
    {'core:sample_start': 30, 'core:comment': 'no end'}], m
for capture in m['captures']: assert type(capture['core:sample_start']) is int
)");
}

TEST(SigmfText, ReadsBackAsWritten) {
    const sigmf_document document = full_document();
    const sigmf_metadata read = parse_sigmf_metadata(sigmf_text(document), "x");
    EXPECT_EQ(read.format, document.format);
    EXPECT_EQ(read.sample_rate_hz, document.sample_rate_hz);
    EXPECT_EQ(read.sha512, document.sha512);
    ASSERT_EQ(read.captures.size(), 2U);
    EXPECT_EQ(read.captures[0].start_utc, document.segments[0].start_utc);
    EXPECT_EQ(read.captures[1].global_index, 1000);
    EXPECT_EQ(read.captures[1].centre_hz, 145.3e6);
}

TEST(SigmfText, ReplacesBytesThatAreNoUtf8) {
    sigmf_document document;
    document.format = parse_sample_format("cf32_le").value();
    document.sample_rate_hz = 48000.5;
    document.lanes = 2;
    document.author = "caf\xE9";
    const std::string text = sigmf_text(document);
    EXPECT_NE(text.find("caf\xEF\xBF\xBD"), text.npos);
    EXPECT_NE(text.find("48000.5"), text.npos);
    EXPECT_EQ(parse_sigmf_metadata(text, "x").lanes, 2U);
}

} // namespace
} // namespace tonewalk
