// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/channel/recording_survey.hpp"

#include <cmath>

#include <gtest/gtest.h>

#include "scene_search.hpp"
#include "support/expect_error.hpp"
#include "tonewalk/base/random.hpp"

namespace tonewalk {
namespace {

using test::caught;
using test::modulated;
using test::pure;
using test::quiet_scene;
using test::source_of;

recording_survey look_at(const scene& s, const search_request& request = {}) {
    test::memory_source source = source_of(s);
    return survey_recording(source, request);
}

recording_survey look_at_pipe(const scene& s) {
    test::memory_source file = source_of(s);
    stream_facts facts = file.facts();
    facts.seekable = false;
    test::memory_source pipe{facts, render_bytes(s)};
    return survey_recording(pipe);
}

scene long_scene(std::vector<scene_carrier> carriers, double duration_s = 40.0) {
    scene s = quiet_scene(std::move(carriers));
    s.rate_hz = 16e3;
    s.duration_s = duration_s;
    s.centre_hz = 145.2e6;
    return s;
}

const sheet_group& carriers_of(const sheet& page) {
    for (const auto& item : page.items) {
        const auto* group = std::get_if<sheet_group>(&item);
        if (group != nullptr && group->key == "carriers") {
            return *group;
        }
    }
    throw std::runtime_error{"no carriers in the sheet"};
}

double number(const sheet& page, std::string_view key) {
    const cell* value = page.find(key);
    return value != nullptr && std::holds_alternative<double>(*value) ? std::get<double>(*value)
                                                                      : not_measured;
}

// Carriers

TEST(RecordingSurvey, ListsCarriersStrongestFirstWithLevelNoiseAndTones) {
    const recording_survey r = look_at(long_scene(
        {modulated(2500.4, -40.0, 700.3, 50.0), pure(-3150.2, -31.0), modulated(5200.0, -25.0)}));
    ASSERT_EQ(r.carriers.size(), 3u);
    EXPECT_NEAR(r.carriers[0].offset_hz, 5200.0, 0.05);
    EXPECT_NEAR(r.carriers[1].offset_hz, -3150.2, 0.05);
    EXPECT_NEAR(r.carriers[2].offset_hz, 2500.4, 0.05);
    EXPECT_NEAR(r.carriers[0].level_dbfs, -25.0, 0.05);
    EXPECT_NEAR(r.carriers[0].carrier_to_noise_density_dbhz, 98.0, 1.0);
    EXPECT_TRUE(r.carriers[1].tones.empty());
    ASSERT_EQ(r.carriers[2].tones.size(), 1u);
    EXPECT_NEAR(r.carriers[2].tones.front().frequency_hz, 700.3, 0.05);
    EXPECT_NEAR(r.carriers[2].tones.front().depth_percent, 50.0, 0.5);
    ASSERT_TRUE(r.best.has_value());
    EXPECT_NEAR(r.best->offset_hz, 5200.0, 0.05);
    EXPECT_TRUE(r.notes.has(note_code::several_carriers));
}

TEST(RecordingSurvey, ACarrierIsFoundWhereverItComesOn) {
    scene_carrier early = modulated(2500.0), late = modulated(-3000.0, -30.0, 700.0);
    early.stop_s = 6.0;
    late.start_s = 30.0;
    const scene s = long_scene({early, late});
    const recording_survey file = look_at(s);
    EXPECT_EQ(file.carriers.size(), 2u);
    const recording_survey pipe = look_at_pipe(s); // its opening alone
    ASSERT_EQ(pipe.carriers.size(), 1u);
    EXPECT_NEAR(pipe.carriers.front().offset_hz, 2500.0, 0.05);
}

TEST(RecordingSurvey, ADriftingCarrierIsOne) {
    scene_carrier c = modulated(2500.0);
    c.drift_hz_s = 5.0; // 200 Hz in all
    const recording_survey r = look_at(long_scene({c}));
    ASSERT_EQ(r.carriers.size(), 1u);
    EXPECT_GT(r.carriers.front().offset_hz, 2499.0);
    EXPECT_LT(r.carriers.front().offset_hz, 2701.0);
}

TEST(RecordingSurvey, TakesACarrierWhereItIsStrongestWithItsTone) {
    scene_carrier c = modulated(2500.0, -30.0, 700.0);
    c.tones.front().start_s = 20.0;
    c.fades = {{0.0, 12.0}, {15.0, 12.0}, {18.0, 0.0}, {30.0, 0.0}, {31.0, 6.0}};
    const recording_survey r = look_at(long_scene({c}));
    ASSERT_EQ(r.carriers.size(), 1u);
    EXPECT_NEAR(r.carriers.front().level_dbfs, -24.0, 0.1);
    EXPECT_NEAR(r.best.value().tone_hz.value_or(0.0), 700.0, 0.1);
}

TEST(RecordingSurvey, SpeechOverManyProbesIsOneCarrier) {
    scene_carrier c = pure(2500.0);
    c.speech_percent = 80.0;
    scene s = long_scene({c});
    s.rate_hz = 48e3;
    const recording_survey r = look_at(s);
    EXPECT_EQ(r.carriers.size(), 1u);
    EXPECT_TRUE(r.notes.has(note_code::no_steady_tone));
}

TEST(RecordingSurvey, NothingFoundIsNoError) {
    for (const double noise_dbfs_hz : {-80.0, scene_none}) {
        scene s = long_scene({});
        s.receiver.noise_dbfs_hz = noise_dbfs_hz;
        const recording_survey r = look_at(s);
        EXPECT_TRUE(r.carriers.empty());
        EXPECT_FALSE(r.best.has_value());
        EXPECT_FALSE(r.balance.has_value());
        EXPECT_EQ(std::isnan(r.noise_density_dbfs_hz), noise_dbfs_hz == scene_none);
    }
}

TEST(RecordingSurvey, ACarrierAtTheBandsEndHasANarrowChannel) {
    const recording_survey r = look_at(long_scene({pure(7950.0)}));
    ASSERT_EQ(r.carriers.size(), 1u);
    EXPECT_NEAR(r.carriers.front().width_hz, 100.0, 0.1);
    EXPECT_TRUE(r.notes.has(note_code::channel_narrowed));
}

TEST(RecordingSurvey, HeedsWhatTheUserSays) {
    const scene s = long_scene({modulated(2500.0), modulated(-3000.0, -30.0, 700.0)});
    const recording_survey r = look_at(s, {.carrier = signed_hz{-2900.0, true}});
    EXPECT_EQ(r.carriers.size(), 2u);
    EXPECT_NEAR(r.best.value().offset_hz, -3000.0, 0.1);
    EXPECT_NEAR(r.best.value().tone_hz.value_or(0.0), 700.0, 0.1);
    EXPECT_EQ(caught([&] { (void)look_at(s, {.carrier = signed_hz{9e3, true}}); }).exit_status, 3);
    EXPECT_EQ(caught([&] { (void)look_at(s, {.width_hz = 12e3}); }).exit_status, 3);
}

TEST(RecordingSurvey, FollowsTheCentreOfEachSegment) {
    scene s = long_scene({modulated(2500.0)}, 0.0);
    s.segments = {{.duration_s = 10.0, .centre_hz = 145.2e6},
                  {.duration_s = 10.0, .centre_hz = 145.203e6}};
    const recording_survey r = look_at(s);
    ASSERT_EQ(r.carriers.size(), 1u);
    EXPECT_NEAR(r.carriers.front().offset_hz, 2500.0, 0.1);
    EXPECT_NEAR(r.best.value().plan.carrier_hz, 145.2025e6, 0.1);
}

TEST(RecordingSurvey, AShortFileIsLookedAtWhole) {
    scene s = long_scene({modulated(2500.0)}, 0.4);
    const recording_survey r = look_at(s);
    EXPECT_EQ(r.carriers.size(), 1u);
    EXPECT_TRUE(r.notes.has(note_code::short_opening));
    s.duration_s = 3.5;
    EXPECT_FALSE(look_at(s).notes.has(note_code::short_opening));
    s.duration_s = 0.0;
    s.samples = 1;
    EXPECT_TRUE(look_at(s).carriers.empty());
}

TEST(RecordingSurvey, AStopEndsItWithWhatItHasSeen) {
    scene_carrier late = modulated(-3000.0, -30.0, 700.0);
    late.start_s = 20.0;
    test::memory_source source = source_of(long_scene({modulated(2500.0), late}));
    std::stop_source stop;
    stop.request_stop();
    const recording_survey r = survey_recording(source, {}, stop.get_token());
    ASSERT_EQ(r.carriers.size(), 1u);
    EXPECT_TRUE(r.best.has_value());
}

// Noise

TEST(RecordingSurvey, NoiseDensityIsTheWhiteFloorUnderStrongAndFadingCarriers) {
    scene_carrier fading = modulated(1800.0, -16.0, 400.0, 90.0);
    fading.waves = {{.amplitude = 1.0, .direction_deg = 0.0},
                    {.amplitude = 0.998, .direction_deg = 180.0}};
    scene_carrier speech = pure(-4000.0, -18.0);
    speech.speech_percent = 70.0;
    for (const double noise_dbfs_hz : {-60.0, -90.0, -125.0}) {
        for (const char* format : {"cf32_le", "ci16_le", "rf32_le"}) {
            scene s = long_scene({fading, speech}, 20.0);
            s.format = parse_sample_format(format).value();
            if (!s.format.is_complex) {
                s.carriers.pop_back();
            }
            s.rate_hz = 48e3;
            s.path.speed_m_s = 1.5;
            s.receiver.noise_dbfs_hz = noise_dbfs_hz;
            EXPECT_NEAR(look_at(s).noise_density_dbfs_hz, noise_dbfs_hz, 0.2)
                << format << ' ' << noise_dbfs_hz;
        }
    }
}

TEST(RecordingSurvey, NoiseDensityHoldsForShortFiles) {
    double error_db = 0.0;
    for (std::uint64_t seed = 1; seed <= 20; ++seed) {
        scene s = long_scene({modulated(2500.0, -30.0)}, 0.5);
        s.seed = seed;
        s.receiver.noise_dbfs_hz = -80.0;
        error_db += (look_at(s).noise_density_dbfs_hz + 80.0) / 20.0;
    }
    EXPECT_NEAR(error_db, 0.0, 0.1);
}

// Balance over probes

TEST(RecordingSurvey, ASignalLockedToTheMirrorPlaceForASecondTurnsOverMinutes) {
    const recording_survey r =
        look_at(long_scene({pure(2500.0), pure(-2500.0 + 0.02, -55.0)}, 120.0));
    ASSERT_TRUE(r.balance.has_value());
    EXPECT_LE(std::abs(r.balance->gain_error_db), r.balance->gain_error_db_u95);
    EXPECT_LE(std::abs(r.balance->phase_error_deg), r.balance->phase_error_deg_u95);
    EXPECT_GT(r.balance->image_ratio_u95, 0.5 * std::pow(10.0, -35.0 / 20.0));
}

// The sheet

TEST(RecordingSurvey, IsDescribedForPeopleAndPrograms) {
    scene s = long_scene({modulated(2500.4), pure(-3100.6, -30.0)});
    s.receiver.iq_gain_error_db = 0.3;
    const test::memory_source source = source_of(s);
    const recording_survey r = look_at(s);
    const sheet page = describe(r, source.facts());
    EXPECT_EQ(number(page, "noise_density_dbfs_hz"), r.noise_density_dbfs_hz);
    EXPECT_NEAR(number(page, "iq_gain_error_db"), 0.3, 0.01);
    EXPECT_NEAR(number(page, "iq_phase_error_deg"), 0.0, 0.05);
    EXPECT_LT(number(page, "iq_gain_error_db_u95"), 0.01);
    EXPECT_LT(number(page, "iq_phase_error_deg_u95"), 0.05);
    const sheet_group& carriers = carriers_of(page);
    EXPECT_TRUE(carriers.list);
    ASSERT_EQ(carriers.parts.size(), 2u);
    const sheet& first = carriers.parts.front();
    EXPECT_NEAR(number(first, "offset_hz"), 2500.4, 0.05);
    EXPECT_NEAR(number(first, "frequency_hz"), 145.2025004e6, 0.05);
    EXPECT_NEAR(number(first, "level_dbfs"), -20.0, 0.05);
    EXPECT_NEAR(number(first, "carrier_to_noise_density_dbhz") - number(first, "snr_db"),
                10.0 * std::log10(6000.0), 0.01); // six times the tone
    EXPECT_NEAR(number(carriers.parts[1], "carrier_to_noise_density_dbhz") -
                    number(carriers.parts[1], "snr_db"),
                10.0 * std::log10(2.0 * (8000.0 - 3100.6)), 0.01); // less than 20 kHz are there
    EXPECT_EQ(std::get<std::string>(*first.find("carrier_option")),
              "--carrier " + format_option_hz(2500.0, true));
    EXPECT_EQ(std::get<std::string>(*carriers.parts[1].find("carrier_option")), "--carrier -3101");
    const auto& tones = std::get<sheet_table>(first.items.back());
    EXPECT_EQ(tones.key, "tones");
    EXPECT_EQ(tones.form, table_form::as_records);
    ASSERT_EQ(tones.rows, 1u);
    EXPECT_NEAR(std::get<double>(tones.columns[0].at(0)), 1000.0, 0.05);
    EXPECT_NEAR(std::get<double>(tones.columns[1].at(0)), 30.0, 0.3);
    ASSERT_EQ(page.curves.size(), 1u);
    EXPECT_EQ(page.curves.front().name, "spectrum");
}

TEST(RecordingSurvey, WhatIsNotKnownIsNull) {
    scene s = long_scene({modulated(2.0)});
    s.centre_hz.reset();
    const test::memory_source source = source_of(s);
    const sheet page = describe(look_at(s), source.facts());
    EXPECT_TRUE(std::isnan(number(page, "iq_gain_error_db_u95")));
    EXPECT_TRUE(std::holds_alternative<std::monostate>(
        *carriers_of(page).parts.front().find("frequency_hz")));
}

// Each carrier is found again by what the survey says to type.
TEST(RecordingSurvey, CarrierOptionsFindTheCarriersAgain) {
    scene s = long_scene({modulated(-7310.3, -40.0, 150.0), pure(1180.7, -20.0), pure(0.2, -90.0),
                          modulated(-0.4, -35.0, 600.0)});
    const test::memory_source source = source_of(s);
    const recording_survey r = look_at(s);
    ASSERT_GE(r.carriers.size(), 3u);
    const sheet page = describe(r, source.facts());
    for (std::size_t k = 0; k < r.carriers.size(); ++k) {
        const auto option =
            std::get<std::string>(*carriers_of(page).parts[k].find("carrier_option"));
        const std::string value = option.substr(option.find(' ') + 1);
        const found_signal again =
            test::search(s, {.carrier = parse_signed_hz(value, "--carrier"), .width_hz = 1200.0});
        EXPECT_NEAR(again.offset_hz, r.carriers[k].offset_hz, 0.1) << option;
    }
}

} // namespace
} // namespace tonewalk
