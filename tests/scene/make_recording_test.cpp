// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/scene/make_recording.hpp"

#include <string>
#include <string_view>
#include <vector>

#include <gtest/gtest.h>

#include "support/expect_error.hpp"
#include "support/run_command.hpp"
#include "support/temporary_folder.hpp"
#include "tonewalk/recording/sigmf_metadata.hpp"
#include "tonewalk/scene/generator.hpp"

namespace {

using namespace tonewalk;

scene broken_walk() {
    return {.rate_hz = 48000.0,
            .centre_hz = 145.2e6,
            .start_utc = parse_utc("2026-05-04T09:30:00Z"),
            .segments = {{.duration_s = 1.0},
                         {.duration_s = 0.5, .lost_s = 0.25, .centre_hz = 145.21e6},
                         {.duration_s = 0.5, .start_utc = parse_utc("2026-05-05T00:00:00Z")}},
            .carriers = {{.offset_hz = 5000.0,
                          .level_dbfs = -12.0,
                          .tones = {{.depth_percent = 30.0}},
                          .waves = {{}, {.amplitude = 0.6, .direction_deg = 180.0}}}},
            .path = {.speed_m_s = 1.5},
            .receiver = {.noise_dbfs_hz = -120.0,
                         .gain_control = scene_gain_control{.target_dbfs = -6.0},
                         .gaps = {{.start_s = 0.4, .duration_s = 0.1}}}};
}

TEST(SceneLayout, SegmentsAndGapsLieOneAfterAnother) {
    const std::vector<scene_stretch> stretches = scene_layout(broken_walk());
    ASSERT_EQ(stretches.size(), 4U);
    const sample_index first[] = {0, 19200, 48000, 72000};
    const sample_index position[] = {0, 24000, 64800, 88800};
    const sample_index count[] = {19200, 28800, 24000, 24000};
    const char* start[] = {"2026-05-04T09:30:00.000Z", "2026-05-04T09:30:00.500Z",
                           "2026-05-04T09:30:01.350Z", "2026-05-05T00:00:00.000Z"};
    for (std::size_t k = 0; k < 4; ++k) {
        EXPECT_EQ(stretches[k].first, first[k]);
        EXPECT_EQ(stretches[k].position, position[k]);
        EXPECT_EQ(stretches[k].count, count[k]);
        EXPECT_EQ(format_utc(*stretches[k].start_utc), start[k]);
        EXPECT_EQ(stretches[k].centre_hz, k == 2 ? 145.21e6 : 145.2e6);
    }
    EXPECT_EQ(stored_samples(broken_walk()), 96000);
}

TEST(MakeRecording, WritesDataAndMetadataThatAgree) {
    const test::temporary_folder folder;
    const made_recording made = make_recording(broken_walk(), folder / "walk");
    EXPECT_EQ(made.samples, 96000);
    const std::string data = test::read_file(folder / "walk.sigmf-data");
    const std::vector<std::byte> bytes = render_bytes(broken_walk());
    ASSERT_EQ(data.size(), bytes.size());
    EXPECT_TRUE(std::equal(bytes.begin(), bytes.end(), data.begin(),
                           [](std::byte a, char b) { return a == static_cast<std::byte>(b); }));
    const sigmf_metadata metadata =
        parse_sigmf_metadata(test::read_file(folder / "walk.sigmf-meta"), "walk.sigmf-meta");
    EXPECT_EQ(metadata.datatype, "ci16_le");
    EXPECT_EQ(metadata.sample_rate_hz, 48000.0);
    EXPECT_EQ(metadata.sha512, made.sha512);
    ASSERT_EQ(metadata.captures.size(), 4U);
    EXPECT_EQ(metadata.captures[1].sample_start, 19200); // SIG-10: the step shows the gap
    EXPECT_EQ(metadata.captures[1].global_index, 24000);
    EXPECT_EQ(metadata.captures[2].centre_hz, 145.21e6);
    EXPECT_EQ(format_utc(*metadata.captures[3].start_utc), "2026-05-05T00:00:00.000Z");
}

constexpr const char* reading_truth = R"(
import hashlib, json, math
truth = json.load(open('walk.truth.json'))
recording, result = truth['recording'], truth['result']
assert recording['samples'] == 96000 and recording['span_s'] == 112800 / 48000, recording
assert recording['sha512'] == hashlib.sha512(open('walk.sigmf-data', 'rb').read()).hexdigest()
assert recording['start_utc'] == '2026-05-04T09:30:00.000000000Z'
assert result['noise_density_dbfs_hz'] == -120.0
assert result['gaps'] == [{'time_s': 0.4, 'samples': 4800}, {'time_s': 1.1, 'samples': 12000}], result['gaps']
carrier, = result['carriers']
assert carrier['carrier_offset_hz'] == 5000.0 and carrier['carrier_hz'] == 145205000.0
assert carrier['tones'][0]['depth_percent'] == 30.0
log = carrier['log']
assert len(log['time_s']) == len(log['carrier_dbfs']) == len(result['receiver_gain_db']) == 236
for k, time_s in enumerate(log['time_s']):
    angle = 2 * math.pi * 145.205e6 / 299792458 * 1.5 * time_s
    field = abs(complex(math.cos(angle), -math.sin(angle)) + 0.6 * complex(math.cos(angle), math.sin(angle)))
    want = -12 + 20 * math.log10(field) + result['receiver_gain_db'][k]
    assert abs(log['carrier_dbfs'][k] - want) < 1e-6, (time_s, log['carrier_dbfs'][k], want)
    assert abs(log['tone_dbfs'][k] - want - 20 * math.log10(0.3)) < 1e-6
kinds = [each['kind'] for each in carrier['extrema']]
assert kinds == ['null', 'peak'] * 3, carrier['extrema']
spacing = carrier['extrema'][2]['position_m'] - carrier['extrema'][0]['position_m']
assert abs(spacing - 299792458 / 145.205e6 / 2) < 1e-6, spacing
assert result['receiver_gain_db'][0] == 0.0 and result['receiver_gain_db'][-1] > 1.0
)";

TEST(OutsideMakeRecording, TruthReadsAsJsonAndHoldsTheFormulas) {
    const test::temporary_folder folder;
    make_recording(broken_walk(), folder / "walk");
    test::write_file(folder / "read.py", reading_truth);
    const test::command_result run =
        test::run_command("cd " + test::shell_quoted(folder.path().string()) +
                          " && " TONEWALK_TEST_PYTHON " read.py");
    EXPECT_EQ(run.status, 0) << run.output;
}

TEST(MakeRecording, WritesAllFilesOrNone) {
    const test::temporary_folder folder;
    test::write_file(folder / "walk.truth.json", "precious");
    const test::caught_error failure =
        test::caught([&] { make_recording(broken_walk(), folder / "walk"); });
    EXPECT_EQ(failure.exit_status, 4);
    EXPECT_TRUE(failure.says("walk.truth.json")) << failure.line;
    EXPECT_FALSE(std::filesystem::exists(folder / "walk.sigmf-data"));
    EXPECT_FALSE(std::filesystem::exists(folder / "walk.sigmf-meta"));
    EXPECT_EQ(test::read_file(folder / "walk.truth.json"), "precious");
    make_recording(broken_walk(), folder / "walk.sigmf-data", true); // the ending is no part of it
    EXPECT_NE(test::read_file(folder / "walk.truth.json"), "precious");
    EXPECT_TRUE(std::filesystem::exists(folder / "walk.sigmf-meta"));
}

TEST(MakeRecording, StoppedLeavesNothing) {
    const test::temporary_folder folder;
    std::stop_source stop;
    stop.request_stop();
    const made_recording made =
        make_recording(broken_walk(), folder / "walk", false, {.stop = stop.get_token()});
    EXPECT_TRUE(made.stopped);
    EXPECT_TRUE(std::filesystem::is_empty(folder.path()));
}

TEST(MakeRecording, DemonstrationScenesAreSmallAndWhole) {
    for (const char* name : {"steady-tone", "corridor-walk", "distant-mast"}) {
        const std::filesystem::path project =
            std::filesystem::path{TONEWALK_TEST_DATA}.parent_path().parent_path();
        std::filesystem::path file = project / "iq-demo" / "scenes" / name;
        file += ".toml";
        const scene read = read_scene(file);
        EXPECT_LT(stored_samples(read) * static_cast<sample_index>(read.format.sample_bytes()),
                  20'000'000)
            << name;
        EXPECT_GE(read.rate_hz, 48e3) << name;
        EXPECT_LE(read.rate_hz, 250e3) << name;
        EXPECT_FALSE(read.description.empty()) << name;
    }
}

} // namespace
