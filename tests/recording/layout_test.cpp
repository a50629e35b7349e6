// SPDX-License-Identifier: GPL-3.0-or-later
// Segments of SigMF recordings: where their samples lie, and how they become stretches.
#include "recording_support.hpp"

namespace tonewalk {
namespace {

using test::define_meta;
using test::drain;
using test::error_of_opening;
using test::run_python;
using test::temporary_folder;

struct opened {
    temporary_folder folder;
    std::unique_ptr<block_source> source;
    const stream_facts& facts() const { return source->facts(); }
    const std::vector<stretch_facts>& stretches() const { return source->facts().stretches; }
};

// Opens "x", which `code` writes; `data(count)` gives `count` cu8 samples, sample n being (n % 251,
// 7).
std::unique_ptr<opened> open_made(const std::string& code,
                                  const std::function<void(recording_request&)>& change = {}) {
    auto made = std::make_unique<opened>();
    run_python(made->folder.path(), define_meta + R"(
def data(count, first=0): return b''.join(bytes([n % 251, 7]) for n in range(first, first + count))
def write(bytes, name='x.sigmf-data'): open(name, 'wb').write(bytes)
)" + code);
    recording_request request;
    request.path = (made->folder / "x").string();
    if (change)
        change(request);
    made->source = open_recording(request);
    return made;
}

// cu8 samples as open_made's data() makes them.
std::vector<cf32> numbered(std::size_t first, std::size_t count) {
    std::vector<cf32> samples;
    for (std::size_t n = first; n < first + count; ++n)
        samples.emplace_back((static_cast<float>(n % 251) - 128.0F) / 128.0F,
                             (7.0F - 128.0F) / 128.0F);
    return samples;
}

// SIG-9: cu8, header_bytes 4 twice, segments at 0 and 500 samples: data begin at bytes 4 and 1008.
TEST(Segments, HeaderBytesLieBeforeEachSegment) {
    const auto made = open_made(R"(
meta('x', 'cu8', [{'core:sample_start': 0, 'core:header_bytes': 4},
                  {'core:sample_start': 500, 'core:header_bytes': 4}], dataset='x.bin',
     trailing_bytes=3)
bytes = b'HEAD' + data(500) + b'HEAD' + data(300, 500) + b'END'
assert bytes[1008] == 500 % 251
write(bytes, 'x.bin')
)");
    ASSERT_EQ(made->stretches().size(), 2U) << "header bytes end a stretch";
    EXPECT_EQ(made->stretches()[1].first, 500);
    EXPECT_EQ(made->stretches()[1].position, 500);
    EXPECT_EQ(made->facts().samples(), 800);
    EXPECT_TRUE(made->facts().notes.all().empty());
    EXPECT_EQ(drain(*made->source).samples, numbered(0, 800));
}

// A non-conforming data set is found by its own name too.
TEST(Segments, ANonConformingDataSetMayBeNamedItself) {
    const auto made = open_made(R"(
meta('x', 'cu8', dataset='x.bin')
write(data(100), 'x.bin')
)",
                                [](recording_request& request) { request.path += ".bin"; });
    EXPECT_EQ(drain(*made->source).samples, numbered(0, 100));
}

// SIG-10: global_index - sample_start steps from 0 to 500: 500 samples are lost.
TEST(Segments, GlobalIndexShowsLostSamples) {
    const auto made = open_made(R"(
meta('x', 'cu8', [{'core:sample_start': 0, 'core:global_index': 0},
                  {'core:sample_start': 500, 'core:global_index': 1000}], rate=1000)
write(data(800))
)");
    ASSERT_EQ(made->stretches().size(), 2U);
    EXPECT_EQ(made->stretches()[0].count, 500);
    EXPECT_EQ(made->stretches()[1].first, 500);
    EXPECT_EQ(made->stretches()[1].position, 1000);
    EXPECT_EQ(made->facts().duration_s(), 0.8);
    EXPECT_EQ(made->facts().span_s(), 1.3);
    EXPECT_TRUE(made->facts().notes.has(note_code::samples_missing));
    const auto all = drain(*made->source, 64, 16); // also: no lead across the gap
    EXPECT_EQ(all.samples, numbered(0, 800));
    for (const auto& block : all.blocks)
        EXPECT_EQ(block.ends_stretch,
                  block.first + static_cast<sample_index>(block.count) == 500 ||
                      block.first + static_cast<sample_index>(block.count) == 800);
}

TEST(Segments, ContiguousOnesOfOneCentreAreOneStretch) {
    const auto made = open_made(R"(
meta('x', 'cu8', [{'core:sample_start': 0, 'core:frequency': 1e6},
                  {'core:sample_start': 100, 'core:frequency': 1e6},
                  {'core:sample_start': 300, 'core:global_index': 300, 'core:frequency': 1e6},
                  {'core:sample_start': 400, 'core:frequency': 2e6},
                  {'core:sample_start': 500}])
write(data(600))
)");
    ASSERT_EQ(made->stretches().size(), 3U);
    EXPECT_FALSE(made->facts().notes.has(note_code::samples_missing));
    EXPECT_EQ(made->stretches()[0].count, 400);
    EXPECT_EQ(made->stretches()[1].centre_hz, 2e6);
    EXPECT_FALSE(made->stretches()[2].centre_hz) << "values do not carry over (SIG-8)";
    EXPECT_EQ(made->facts().centre_hz, 1e6);
}

TEST(Segments, TimesShowGapsOfASampleAndMore) {
    const auto made = open_made(R"(
t = '2026-05-04T09:30:0'
meta('x', 'cu8', [{'core:sample_start': 0, 'core:datetime': t + '0.000000Z'},
                  {'core:sample_start': 500, 'core:datetime': t + '0.500400Z'},
                  {'core:sample_start': 600, 'core:datetime': t + '0.850000Z'}], rate=1000)
write(data(700))
)");
    ASSERT_EQ(made->stretches().size(), 2U) << "0.4 samples are no gap, 249.6 are";
    EXPECT_EQ(made->stretches()[0].count, 600);
    EXPECT_EQ(made->stretches()[1].position, 850);
}

TEST(Segments, TimesShowNoGapBelowTheirOwnResolution) {
    const auto made = open_made(R"(
meta('x', 'cu8', [{'core:sample_start': 0, 'core:datetime': '2026-05-04T09:30:00.000Z'},
                  {'core:sample_start': 500, 'core:datetime': '2026-05-04T09:30:00.001Z'}], rate=1e6)
write(data(700))
)");
    ASSERT_EQ(made->stretches().size(), 1U) << "0.5 ms of 1 ms resolution";
}

TEST(Segments, CapturesBeyondTheDataAreIgnored) { // SIG-15
    const auto made = open_made(R"(
meta('x', 'cu8', [{'core:sample_start': 0}, {'core:sample_start': 100, 'core:frequency': 1e6},
                  {'core:sample_start': 5000000000000000, 'core:frequency': 2e6}])
write(data(100))
)");
    ASSERT_EQ(made->stretches().size(), 1U);
    EXPECT_EQ(made->facts().samples(), 100);
}

TEST(Segments, OffsetIsTheIndexOfTheFirstSample) {
    const auto made = open_made(R"(
meta('x', 'cu8', [{'core:sample_start': 1000, 'core:frequency': 1e6},
                  {'core:sample_start': 1050, 'core:frequency': 2e6}], offset=1000)
write(data(100))
)");
    ASSERT_EQ(made->stretches().size(), 2U);
    EXPECT_EQ(made->stretches()[0].first, 0);
    EXPECT_EQ(made->stretches()[1].first, 50);
    EXPECT_EQ(drain(*made->source).samples, numbered(0, 100));
}

TEST(Segments, SamplesBeforeTheFirstCaptureCountToo) {
    const auto made = open_made(R"(
meta('x', 'cu8', [{'core:sample_start': 40, 'core:frequency': 1e6,
                   'core:datetime': '2026-05-04T09:30:10Z'}], rate=4)
write(data(100))
)");
    ASSERT_EQ(made->stretches().size(), 2U);
    EXPECT_FALSE(made->stretches()[0].centre_hz);
    EXPECT_EQ(made->facts().start_utc, parse_utc("2026-05-04T09:30:00Z"));
}

TEST(Segments, EmptyListMeansOneSegmentAndAnOddTailIsNoted) {
    const auto made = open_made("meta('x', 'cu8', []); write(data(100) + b'x')");
    EXPECT_EQ(made->facts().samples(), 100);
    EXPECT_TRUE(made->facts().notes.has(note_code::odd_tail));
}

TEST(Segments, CutsCountGaps) {
    const auto made = open_made(R"(
meta('x', 'cu8', [{'core:sample_start': 0, 'core:global_index': 0},
                  {'core:sample_start': 500, 'core:global_index': 1000}], rate=1000)
write(data(800))
)",
                                [](recording_request& request) {
                                    request.from = 0.4;
                                    request.until = 1.1;
                                });
    ASSERT_EQ(made->stretches().size(), 2U);
    EXPECT_EQ(made->stretches()[0].first, 400);
    EXPECT_EQ(made->stretches()[0].count, 100);
    EXPECT_EQ(made->stretches()[1].position, 1000);
    EXPECT_EQ(made->stretches()[1].count, 100);
    auto expected = numbered(400, 200);
    EXPECT_EQ(drain(*made->source, 48, 8).samples, expected);
    // Only a gap is left.
    recording_request request;
    request.path = (made->folder / "x").string();
    request.from = 0.6;
    request.until = 0.9;
    EXPECT_TRUE(error_of_opening(request).says("lies in a gap"));
}

TEST(Segments, CentreOverridesAllButStretchesStay) {
    const auto made = open_made(R"(
meta('x', 'cu8', [{'core:sample_start': 0, 'core:frequency': 1e6},
                  {'core:sample_start': 50, 'core:frequency': 2e6}])
write(data(100))
)",
                                [](recording_request& request) { request.centre_hz = 1e6; });
    ASSERT_EQ(made->stretches().size(), 2U);
    EXPECT_EQ(made->stretches()[1].centre_hz, 1e6);
    EXPECT_TRUE(made->facts().notes.has(note_code::metadata_overridden));
}

TEST(MalformedRecording, WhatMetadataAndDataDoNotAgreeOnIsNamed) {
    struct row {
        const char* code;
        const char* says;
    };
    for (const row& row :
         {row{"meta('x', 'cf32'); write(data(8))", "core:datatype: \"cf32\""},
          row{"meta('x', 'cu8', trailing_bytes=500); write(data(8))", "core:trailing_bytes"},
          row{"meta('x', 'cu8', [{'core:sample_start': 0, 'core:header_bytes': 99}]); "
              "write(data(8))",
              "holds no samples"},
          row{"meta('x', 'cu8')", "data file \"x.sigmf-data\" is missing"},
          row{"meta('x', 'cu8', dataset='other.bin'); write(data(8))",
              "data file \"other.bin\" is missing"},
          row{"meta('x', 'cu8', metadata_only=True)", "metadata only"},
          row{"meta('x', 'cu8'); write(b'')", "holds no samples"},
          row{"meta('x', 'cu8', [{'core:sample_start': 0, 'core:global_index': 50}, "
              "{'core:sample_start': 4, 'core:global_index': 52}]); write(data(8))",
              "captures[1], core:global_index"},
          row{"open('x.sigmf-meta', 'wb').truncate(65 << 20); write(data(8))", "too long"}}) {
        const auto failure = test::caught([&] { (void)open_made(row.code); });
        ASSERT_TRUE(failure.kind.has_value()) << row.code;
        EXPECT_EQ(failure.exit_status, 3) << failure.line;
        EXPECT_TRUE(failure.says(row.says)) << failure.line;
        EXPECT_EQ(failure.line.find('\n'), failure.line.npos);
    }
}

// SIG-7: a data set that is there counts for more than core:metadata_only.
TEST(Segments, DataThatAreThereCountForMoreThanMetadataOnly) {
    const auto made = open_made("meta('x', 'cu8', dataset='d', metadata_only=True); "
                                "write(data(8), 'd')");
    EXPECT_EQ(made->facts().samples(), 8);
}

} // namespace
} // namespace tonewalk
