// SPDX-License-Identifier: GPL-3.0-or-later
#include <filesystem>
#include <string>

#include <gtest/gtest.h>

#include "support/expect_error.hpp"
#include "tonewalk/scene/generator.hpp"
#include "tonewalk/scene/make_recording.hpp"

namespace {

using namespace tonewalk;

constexpr const char* complete = R"(
[recording]
format = "cf32_be"
rate_hz = 250e3
centre_hz = 433.92e6
start_utc = 2026-05-04T09:30:00Z
samples = 100003
seed = 99
truth_every_s = 0.02
description = "everything"

[[carrier]]
offset_hz = 31e3
level_dbfs = -9
phase_deg = 5
drift_hz_s = 1.5
wobble_hz = 2
wobble_period_s = 3
phase_noise_dbc_hz = -80
phase_noise_offset_hz = 500
start_s = 0.01
stop_s = 0.3
speech_percent = 10
overmodulation = "pinch-off"
[[carrier.tone]]
frequency_hz = 400
depth_percent = 90
phase_deg = -10
start_s = 0.1
stop_s = 0.2
incidental_rad = 0.05
incidental_phase_deg = 30
harmonic = [{ order = 2, percent = 3, phase_deg = 12 }]
[[carrier.hum]]
frequency_hz = 50
depth_percent = 1
phase_deg = 2
[[carrier.wave]]
amplitude = 0.9
phase_deg = 1
direction_deg = 2
delay_s = 3e-6
[[carrier.fade]]
time_s = 0
level_db = -3
[carrier.polarization]
axial_ratio_db = 6
tilt_deg = 7
isolation_db = 30
isolation_phase_deg = 8
[carrier.pattern]
kind = "cardioid"
bearing_deg = 9
front_to_back_db = 15

[[carrier]]
offset_hz = -1000
follows_centre = true

[path]
point = [{ time_s = 0, position_m = 1 }, { time_s = 1, position_m = 2 }]
angle = [{ time_s = 0, angle_deg = 3 }]

[receiver]
noise_dbfs_hz = -120
compression_dbfs = 2
iq_gain_error_db = 0.1
iq_phase_error_deg = 0.2
dc_dbfs = -50
dc_phase_deg = 1
clip_dbfs = 0
gain_step = [{ time_s = 0.1, gain_db = -6 }]
gain_control = { target_dbfs = -15, attack_s = 0.02, release_s = 0.5, least_db = -30, most_db = 20, begin_db = 1 }
spur = [{ offset_hz = 10, level_dbfs = -70, phase_deg = 4 }]
gap = [{ start_s = 0.1, samples = 5 }, { start_s = 0.2, duration_s = 0.01 }]
non_finite = [{ first = 10, count = 2, value = "-inf" }]
)";

TEST(SceneToml, EveryKeyReachesItsPlace) {
    const scene read = parse_scene(complete, "complete.toml");
    EXPECT_EQ(read.format.name(), "cf32_be");
    EXPECT_EQ(read.samples, 100003);
    EXPECT_EQ(read.seed, 99U);
    EXPECT_EQ(format_utc(*read.start_utc, 0), "2026-05-04T09:30:00Z");
    ASSERT_EQ(read.carriers.size(), 2U);
    const scene_carrier& carrier = read.carriers[0];
    EXPECT_EQ(carrier.wobble_period_s, 3.0);
    EXPECT_EQ(carrier.phase_noise_offset_hz, 500.0);
    EXPECT_EQ(carrier.stop_s, 0.3);
    EXPECT_EQ(carrier.overmodulation, overmodulation::pinch_off);
    EXPECT_EQ(carrier.tones.at(0).incidental_phase_deg, 30.0);
    EXPECT_EQ(carrier.tones.at(0).harmonics.at(0).phase_deg, 12.0);
    EXPECT_EQ(carrier.hum.at(0).phase_deg, 2.0);
    EXPECT_EQ(carrier.waves.at(0).delay_s, 3e-6);
    EXPECT_EQ(carrier.fades.at(0).value, -3.0);
    EXPECT_EQ(carrier.polarization.value().isolation_phase_deg, 8.0);
    EXPECT_EQ(carrier.pattern.value().front_to_back_db, 15.0);
    EXPECT_TRUE(read.carriers[1].follows_centre);
    EXPECT_EQ(read.carriers[1].stop_s, scene_never);
    EXPECT_EQ(read.path.points.at(1).value, 2.0);
    EXPECT_EQ(read.path.angles.at(0).value, 3.0);
    EXPECT_EQ(read.receiver.gain_steps.at(0).gain_db, -6.0);
    EXPECT_EQ(read.receiver.gain_control.value().begin_db, 1.0);
    EXPECT_EQ(read.receiver.spurs.at(0).phase_deg, 4.0);
    EXPECT_EQ(read.receiver.gaps.at(0).samples, 5);
    EXPECT_EQ(read.receiver.gaps.at(1).duration_s, 0.01);
    EXPECT_EQ(read.receiver.non_finite.at(0).value, scene_non_finite::kind::minus_infinity);
}

struct refusal {
    const char* text;
    const char* line; ///< the whole error line
};
const refusal refusals[] = {
    {"[recording]\nrate_hz = 48000\n[[carrier]]\nofset_hz = 100\n",
     "s.toml, line 4, carrier[0].ofset_hz"},
    {"[recording]\nrate_hz = 48000\n\n[[carrier]]\noffset_hz = 25000\n",
     "s.toml, line 5, carrier[0].offset_hz: is 25000: the carrier and its sidebands leave the band "
     "of -24000 to 24000 Hz; move the carrier, lower the tones or raise rate_hz"},
    {"[recording]\nrate_hz = 48000\n[[carrier]]\n[[carrier.tone]]\nfrequency_hz = 1000\n"
     "[[carrier.tone]]\nfrequency_hz = 0\n",
     "s.toml, line 7, carrier[0].tone[1].frequency_hz: is 0; give a number above 0"},
    {"[recording]\nduration_s = 1\n", "rate_hz"},
    {"[recording]\nrate_hz = 48000\nduration_s = 1\nsamples = 5\n",
     "s.toml, line 4, recording.samples: stands beside duration_s; keep one of them"},
    {"[recording]\nrate_hz = \"fast\"\n", "s.toml, line 2, recording.rate_hz"},
    {"[recording]\nrate_hz = inf\n", "s.toml, line 2, recording.rate_hz"},
    {"[recording]\nrate_hz = 48000\nformat = \"ci12\"\n",
     "s.toml, line 3, recording.format: is \"ci12\"; write one such as ci16_le, cf32_le, cu8 or "
     "ri16_le"},
    {"[recording]\nrate_hz = 48000\n[[carrier]]\novermodulation = \"folds\"\n", "fold"},
    {"[recording]\nrate_hz = 48000\n[path]\nspeed_m_s = 1\n[[carrier]]\n[[carrier.wave]]\n",
     "no centre is known; add centre_hz to [recording]"},
    {"[recording]\nrate_hz = 48000\n[receiver]\nnon_finite = [{ first = 3 }]\n",
     "s.toml, line 4, receiver.non_finite[0].first: has no code in integer samples; choose a "
     "format such as cf32_le"},
    {"[recording]\nrate_hz = 48000\n[receiver]\ngap = [{ start_s = 2, duration_s = 1 }]\n",
     "reaches beyond the end of the recording"},
    {"[recording]\nrate_hz = 48000\n[[carrier]]\nfade = [{ time_s = 1, level_db = 0 },\n"
     "  { time_s = 1, level_db = 3 }]\n",
     "s.toml, line 5, carrier[0].fade[1].time_s: does not come after the point before; put the "
     "points in order of time"},
    {"[recording\n", "s.toml, line"}};

TEST(MalformedScene, IsRefusedWithFileLineKeyAndMend) {
    for (const refusal& each : refusals) {
        const test::caught_error failure =
            test::caught([&] { static_cast<void>(parse_scene(each.text, "s.toml")); });
        ASSERT_TRUE(failure.kind) << each.text;
        EXPECT_EQ(failure.exit_status, 3) << each.text;
        EXPECT_TRUE(failure.says(each.line)) << failure.line;
        EXPECT_EQ(failure.line.find('\n'), std::string::npos) << failure.line;
        EXPECT_NE(failure.line.find("; "), std::string::npos) << failure.line;
    }
}

TEST(MalformedScene, SuggestsTheNameThatWasMeant) {
    const test::caught_error failure =
        test::caught([] { static_cast<void>(parse_scene(refusals[0].text, "s.toml")); });
    EXPECT_TRUE(failure.says("offset_hz?")) << failure.line;
}

TEST(MalformedScene, AMissingFileIsUnreadable) {
    const test::caught_error failure =
        test::caught([] { static_cast<void>(read_scene("/nowhere/scene.toml")); });
    EXPECT_EQ(failure.exit_status, 3);
    EXPECT_TRUE(failure.says("/nowhere/scene.toml"));
}

TEST(MalformedScene, CodeThatAsksForTheImpossibleIsToldSo) {
    const test::caught_error failure = test::caught([] {
        static_cast<void>(render_bytes({.samples = 100, .carriers = {{.level_dbfs = 1e4}}}));
    });
    EXPECT_EQ(failure.line, "scene, carrier[0].level_dbfs: is 10000 dB; give -300 to 300 dB");
}

} // namespace
