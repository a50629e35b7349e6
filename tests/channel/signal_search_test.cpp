// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/channel/signal_search.hpp"

#include <algorithm>
#include <cmath>
#include <string>

#include <gtest/gtest.h>

#include "scene_search.hpp"
#include "support/expect_error.hpp"
#include "tonewalk/base/random.hpp"

namespace tonewalk {
namespace {

using test::caught;
using test::has;
using test::modulated;
using test::pure;
using test::quiet_scene;
using test::search;
using test::text_of;

constexpr double close_hz = 0.05;

void expect_found(const found_signal& f, double offset_hz, double tone_hz) {
    EXPECT_NEAR(f.offset_hz, offset_hz, close_hz);
    ASSERT_TRUE(f.tone_hz.has_value());
    EXPECT_NEAR(*f.tone_hz, tone_hz, close_hz);
}

scene noise_only(double rate_hz, double duration_s, std::uint64_t seed) {
    scene s = quiet_scene({});
    s.rate_hz = rate_hz;
    s.duration_s = duration_s;
    s.seed = seed;
    s.receiver.noise_dbfs_hz = -30.0 - 10.0 * std::log10(rate_hz);
    return s;
}

// Which line is the carrier

TEST(SignalSearch, FindsACleanCarrierAndItsTone) {
    const found_signal f = search(quiet_scene({modulated(7312.34, -20.0, 1013.7, 30.0)}));
    expect_found(f, 7312.34, 1013.7);
    ASSERT_EQ(f.carriers.size(), 1u);
    EXPECT_NEAR(f.carriers.front().level_dbfs, -20.0, 0.05);
    EXPECT_NEAR(f.carriers.front().carrier_to_noise_density_dbhz, 103.0, 1.0);
    EXPECT_NEAR(f.carriers.front().tones.front().depth_percent, 30.0, 0.3);
    EXPECT_NEAR(f.width_hz, 6.0 * 1013.7, 1.0); // its third harmonic fits
    EXPECT_TRUE(f.notes.all().empty());
}

TEST(SignalSearch, PrefersTheCarrierWithATone) {
    const found_signal f = search(quiet_scene(
        {modulated(7312.34, -32.0, 1013.7), pure(-11'021.0, -14.0), pure(3000.0, -30.0)}));
    expect_found(f, 7312.34, 1013.7);
    EXPECT_EQ(f.carriers.size(), 3u);
}

TEST(SignalSearch, NamesRivalsWithinTwentyDecibels) {
    const found_signal f =
        search(quiet_scene({modulated(7312.34, -20.0, 1013.7), pure(-11'021.0, -39.5)}));
    EXPECT_NE(text_of(f, note_code::several_carriers).find("--carrier -11021"), std::string::npos);
    const found_signal weaker =
        search(quiet_scene({modulated(7312.34, -20.0, 1013.7), pure(-11'021.0, -40.5)}));
    EXPECT_FALSE(has(weaker, note_code::several_carriers));
}

TEST(SignalSearch, DirectCurrentIsNoCarrier) {
    scene s = quiet_scene({modulated(7312.34, -40.0, 1013.7)});
    s.receiver.dc_dbfs = -6.0;
    const found_signal f = search(s);
    expect_found(f, 7312.34, 1013.7);
    EXPECT_EQ(f.carriers.size(), 1u);
    s.carriers.clear();
    EXPECT_EQ(caught([&] { search(s); }).exit_status, 3);
}

TEST(SignalSearch, CarrierAtTheCentreCountsWithAPairOnly) {
    for (const double offset_hz : {0.0, 1.3, -4.1}) {
        const found_signal f = search(quiet_scene({modulated(offset_hz, -20.0, 1013.7)}));
        expect_found(f, offset_hz, 1013.7);
        EXPECT_FALSE(has(f, note_code::dc_in_channel)) << "the carrier itself stands there";
        EXPECT_FALSE(has(f, note_code::image_in_channel));
        EXPECT_EQ(caught([&] { search(quiet_scene({pure(offset_hz)})); }).exit_status, 3);
    }
}

TEST(SignalSearch, AnImageIsNoCarrier) {
    scene s = quiet_scene({modulated(7312.34, -20.0, 1013.7)});
    s.receiver.iq_gain_error_db = 0.9; // the image 25 dB down
    const found_signal f = search(s);
    expect_found(f, 7312.34, 1013.7);
    EXPECT_EQ(f.carriers.size(), 1u);
}

TEST(SignalSearch, TellsTransmittersFourKilohertzApart) {
    for (const double tone_hz : {1000.0, 1013.7}) { // 1000: the rival stands where a harmonic would
        const found_signal f = search(quiet_scene(
            {modulated(7312.34, -20.0, tone_hz), modulated(11'312.34, -26.0, tone_hz)}));
        expect_found(f, 7312.34, tone_hz);
        ASSERT_EQ(f.carriers.size(), 2u);
        EXPECT_NEAR(f.carriers.back().offset_hz, 11'312.34, close_hz);
        EXPECT_TRUE(has(f, note_code::several_carriers));
        EXPECT_TRUE(has(f, note_code::carrier_in_channel)); // within 0.75 x 6 kHz
    }
}

TEST(SignalSearch, CarrierInChannelBeginsAtThreeQuartersOfTheWidth) {
    const auto with_neighbour = [](double away_hz) {
        return search(
            quiet_scene({modulated(7000.0, -20.0, 1000.0), pure(7000.0 + away_hz, -50.0)}));
    };
    EXPECT_TRUE(has(with_neighbour(4450.0), note_code::carrier_in_channel));
    EXPECT_FALSE(has(with_neighbour(4550.0), note_code::carrier_in_channel));
}

// Offset-carrier sites on one aeronautical channel beat at kilohertz: ICAO Annex 10 (from memory).
TEST(SignalSearch, ALineWithoutItsMirrorIsAnotherCarrierNeverATone) {
    const found_signal f =
        search(quiet_scene({pure(2000.0, -20.0), pure(4500.0, -23.0), pure(-3000.0, -22.0)}));
    EXPECT_FALSE(f.tone_hz.has_value());
    EXPECT_EQ(f.carriers.size(), 3u);
    EXPECT_NEAR(f.offset_hz, 2000.0, close_hz);
    EXPECT_TRUE(has(f, note_code::no_tone));
    EXPECT_TRUE(has(f, note_code::several_carriers));
}

TEST(SignalSearch, HarmonicsOfATransmitterAreNotCarriers) {
    scene_carrier c = modulated(-5210.4, -20.0, 1013.7, 80.0);
    c.tones.front().harmonics = {{.order = 2, .percent = 8.0}, {.order = 3, .percent = 5.0}};
    c.tones.push_back({.frequency_hz = 1700.3, .depth_percent = 15.0});
    const found_signal f = search(quiet_scene({c}));
    expect_found(f, -5210.4, 1013.7);
    EXPECT_EQ(f.carriers.size(), 1u);
}

// Which pair is the tone

TEST(SignalSearch, HumLosesToATone) {
    scene_carrier c = modulated(7312.34, -20.0, 1013.7, 2.0);
    c.hum = {{.frequency_hz = 100.0, .depth_percent = 4.5},
             {.frequency_hz = 60.0, .depth_percent = 4.5}};
    expect_found(search(quiet_scene({c})), 7312.34, 1013.7);
    c.hum.front().depth_percent = 5.5; // no longer taken for hum
    expect_found(search(quiet_scene({c})), 7312.34, 100.0);
}

TEST(SignalSearch, HumIsTheToneWhereThereIsNoOther) {
    expect_found(search(quiet_scene({modulated(7312.34, -20.0, 100.0, 3.0)})), 7312.34, 100.0);
}

TEST(SignalSearch, StrongestToneWinsAndTheLowerWithinOneDecibel) {
    const auto with_two = [](double low_percent, double high_percent) {
        scene_carrier c = modulated(7312.34, -20.0, 437.1, low_percent);
        c.tones.push_back({.frequency_hz = 2013.7, .depth_percent = high_percent});
        return search(quiet_scene({c}));
    };
    expect_found(with_two(28.0, 30.0), 7312.34, 437.1);  // 0.6 dB weaker, but lower
    expect_found(with_two(26.0, 30.0), 7312.34, 2013.7); // 1.2 dB weaker
}

TEST(SignalSearch, TonesReachFromTwentyHertzToTwelveKilohertz) {
    scene s = quiet_scene({modulated(7312.34, -20.0, 21.3)});
    expect_found(search(s), 7312.34, 21.3);
    s.rate_hz = 96e3;
    s.carriers = {modulated(7312.34, -20.0, 11'950.0)};
    expect_found(search(s), 7312.34, 11'950.0);
    s.carriers = {modulated(7312.34, -20.0, 12'100.0)};
    EXPECT_FALSE(search(s).tone_hz.has_value());
}

TEST(SignalSearch, AToneJustAboveTheNoiseCountsAndOneBelowDoesNot) {
    scene s = quiet_scene({modulated(7312.34, -20.0, 1013.7, 30.0)});
    const auto with_line_snr = [&](double db) {
        // A sideband has A m / 2; the noise of a bin has the density times 1.0 Hz (2 s, 4-term
        // window).
        s.receiver.noise_dbfs_hz =
            -20.0 + 20.0 * std::log10(0.15) - db - 10.0 * std::log10(2.0 / 2.0);
        return search(s);
    };
    expect_found(with_line_snr(17.0), 7312.34, 1013.7);
    const found_signal below = with_line_snr(5.0);
    EXPECT_FALSE(below.tone_hz.has_value());
    EXPECT_TRUE(has(below, note_code::no_tone));
}

TEST(SignalSearch, SpeechHasNoSteadyTone) {
    for (std::uint64_t seed = 1; seed <= 20; ++seed) {
        scene_carrier c = pure(7312.34, -20.0);
        c.speech_percent = 80.0;
        scene s = quiet_scene({c});
        s.duration_s = 5.0;
        s.seed = seed;
        const found_signal f = search(s);
        EXPECT_NEAR(f.offset_hz, 7312.34, 0.2) << seed;
        EXPECT_FALSE(f.tone_hz.has_value()) << seed << ": " << *f.tone_hz;
        EXPECT_TRUE(has(f, note_code::no_steady_tone)) << seed;
        EXPECT_FALSE(has(f, note_code::no_tone)) << seed;
        EXPECT_EQ(f.carriers.size(), 1u) << seed;
        EXPECT_DOUBLE_EQ(f.width_hz, 20e3) << seed;
    }
}

TEST(SignalSearch, APureCarrierIsNotModulated) {
    for (const double offset_hz : {7312.34, 21'500.0, -123.4}) {
        for (const double noise_dbfs_hz : {scene_none, -140.0, -80.0}) {
            scene s = quiet_scene({pure(offset_hz)});
            s.receiver.noise_dbfs_hz = noise_dbfs_hz;
            EXPECT_TRUE(has(search(s), note_code::no_tone)) << offset_hz << ' ' << noise_dbfs_hz;
        }
    }
}

TEST(SignalSearch, PhaseNoiseIsNoSpeech) {
    scene_carrier c = pure(7312.34);
    c.phase_noise_dbc_hz = -60.0;
    const found_signal f = search(quiet_scene({c}));
    EXPECT_TRUE(has(f, note_code::no_tone));
    EXPECT_EQ(f.carriers.size(), 1u);
}

TEST(SignalSearch, AToneThatLastsOneSecondIsSteadyAndAShortOneIsNot) {
    scene_carrier c = pure(7312.34, -20.0);
    c.tones = {{.frequency_hz = 1013.7, .depth_percent = 50.0, .start_s = 0.3, .stop_s = 1.6}};
    const found_signal lasting = search(quiet_scene({c}));
    EXPECT_TRUE(lasting.tone_hz.has_value());
    c.tones.front().stop_s = 0.7;
    const found_signal brief = search(quiet_scene({c}));
    EXPECT_FALSE(brief.tone_hz.has_value());
    EXPECT_TRUE(has(brief, note_code::no_steady_tone));
}

TEST(SignalSearch, FindsAToneUnderSpeech) {
    scene_carrier c = modulated(7312.34, -20.0, 1013.7, 30.0);
    c.speech_percent = 20.0;
    expect_found(search(quiet_scene({c})), 7312.34, 1013.7);
}

// Weak, fading and moving carriers

// 3-dB-below-noise carrier in 20 kHz with 30 % tone: each sideband 20 dB over the noise of 1 Hz.
TEST(SignalSearch, FindsAWeakCarrierAndItsTone) {
    for (std::uint64_t seed = 1; seed <= 20; ++seed) {
        scene s = quiet_scene({modulated(7312.34, -40.0, 1013.7, 30.0)});
        s.seed = seed;
        s.receiver.noise_dbfs_hz = -40.0 + 3.0 - 10.0 * std::log10(20e3);
        const found_signal f = search(s);
        EXPECT_NEAR(f.offset_hz, 7312.34, 0.1) << seed;
        ASSERT_TRUE(f.tone_hz.has_value()) << seed;
        EXPECT_NEAR(*f.tone_hz, 1013.7, 0.2) << seed;
    }
}

TEST(SignalSearch, FollowsNeitherDriftNorWobbleAway) {
    for (const double drift_hz_s : {5.0 / 60.0, -5.0 / 60.0}) {
        scene_carrier c = modulated(7312.34, -20.0, 1013.7);
        c.drift_hz_s = drift_hz_s;
        const found_signal f = search(quiet_scene({c}));
        EXPECT_NEAR(f.offset_hz, 7312.34 + drift_hz_s, 0.1);
        EXPECT_NEAR(f.tone_hz.value_or(0.0), 1013.7, close_hz);
    }
    scene_carrier c = modulated(7312.34, -20.0, 1013.7);
    c.wobble_hz = 2.0;
    c.wobble_period_s = 0.7;
    const found_signal f = search(quiet_scene({c}));
    EXPECT_NEAR(f.offset_hz, 7312.34, 3.0);
    EXPECT_NEAR(f.tone_hz.value_or(0.0), 1013.7, 0.5);
}

TEST(SignalSearch, FindsTheToneThroughFades) {
    scene_carrier c = modulated(7312.34, -20.0, 1013.7);
    c.waves = {{.amplitude = 1.0, .direction_deg = 0.0},
               {.amplitude = 0.9, .phase_deg = 70.0, .direction_deg = 180.0}};
    for (const double speed_m_s : {0.5, 1.5, 5.0}) {
        scene s = quiet_scene({c});
        s.centre_hz = 145e6;
        s.path.speed_m_s = speed_m_s;
        const found_signal f = search(s);
        EXPECT_NEAR(f.offset_hz, 7312.34, 3.0) << speed_m_s;
        EXPECT_NEAR(f.tone_hz.value_or(0.0), 1013.7, 0.1) << speed_m_s;
        EXPECT_FALSE(has(f, note_code::no_steady_tone)) << speed_m_s;
        EXPECT_EQ(f.carriers.size(), 1u) << speed_m_s;
    }
}

// What stands before the fade and what comes after it add up to a line beside the true frequency.
TEST(SignalSearch, FindsTheToneWhereADeepFadePartsTheOpening) {
    scene_carrier c = modulated(-6901.0, -27.4, 2956.74, 35.0);
    c.fades = {{0.44, 0.0}, {0.99, -60.0}, {1.54, 0.0}};
    for (std::uint64_t seed = 1; seed <= 5; ++seed) {
        c.tones.front().frequency_hz += 0.13;
        scene s = quiet_scene({c});
        s.seed = seed;
        EXPECT_NEAR(search(s).tone_hz.value_or(0.0), c.tones.front().frequency_hz, 0.1) << seed;
    }
}

// Noise and silence

TEST(CoverageSignalSearch, NoiseAloneIsNeverACarrier) {
    int found = 0;
    for (std::uint64_t seed = 1; seed <= 200; ++seed) {
        const scene s = noise_only(seed % 2 == 0 ? 48e3 : 12e3, seed % 3 == 0 ? 0.4 : 2.0, seed);
        const auto failure = caught([&] { search(s); });
        found += failure.kind ? 0 : 1;
        if (failure.kind) {
            EXPECT_EQ(failure.exit_status, 3);
            EXPECT_TRUE(failure.says("--carrier"));
        }
    }
    EXPECT_EQ(found, 0);
}

TEST(SignalSearch, SilenceHoldsNoCarrier) {
    scene s = quiet_scene({});
    s.receiver.noise_dbfs_hz = scene_none;
    EXPECT_EQ(caught([&] { search(s); }).exit_status, 3);
}

// Where to look

TEST(SignalSearch, ACarrierThatComesOnLaterIsFoundInAFile) {
    scene_carrier c = modulated(7312.34, -20.0, 1013.7);
    c.start_s = 8.0;
    scene s = quiet_scene({c});
    s.duration_s = 20.0;
    const found_signal f = search(s);
    expect_found(f, 7312.34, 1013.7);
    EXPECT_TRUE(has(f, note_code::late_carrier));
    s.carriers.front().start_s = 0.9; // half of the opening
    EXPECT_FALSE(has(search(s), note_code::late_carrier));
}

TEST(SignalSearch, SaysWhenTheOpeningIsShort) {
    scene s = quiet_scene({modulated(7312.34, -20.0, 1013.7)});
    s.duration_s = 0.99;
    EXPECT_TRUE(has(search(s), note_code::short_opening));
    s.duration_s = 1.0;
    EXPECT_FALSE(has(search(s), note_code::short_opening));
}

TEST(SignalSearch, FindsATonePairInRealSamples) {
    scene s = quiet_scene({modulated(11'312.34, -20.0, 1013.7)});
    s.format = parse_sample_format("ri16_le").value();
    expect_found(search(s), 11'312.34, 1013.7);
    s.format = parse_sample_format("rf32_le").value();
    s.rate_hz = 200e3;
    expect_found(search(s), 11'312.34, 1013.7);
}

// What the user says

TEST(SignalSearch, AGivenCarrierIsAStartingPoint) {
    scene s = quiet_scene({modulated(7312.34, -30.0, 1013.7), modulated(-4000.0, -10.0, 700.0)});
    s.centre_hz = 145.2e6;
    const search_request offset{.carrier = signed_hz{7200.0, true}};
    expect_found(search(s, offset), 7312.34, 1013.7);
    const search_request absolute{.carrier = signed_hz{145.2e6 + 7200.0, false}};
    const found_signal f = search(s, absolute);
    expect_found(f, 7312.34, 1013.7);
    EXPECT_TRUE(f.plan.absolute);
    EXPECT_NEAR(f.plan.carrier_hz, 145.2e6 + 7312.34, close_hz);
    EXPECT_FALSE(search(s, offset).plan.absolute);
}

TEST(SignalSearch, AGivenCarrierReachesAQuarterOfTheWidthAndFiveHundredHertz) {
    const scene s = quiet_scene({modulated(7312.34, -20.0, 1013.7)});
    const auto start_at = [&](double hz, std::optional<double> width_hz) {
        return search(s, {.carrier = signed_hz{hz, true}, .width_hz = width_hz}).offset_hz;
    };
    EXPECT_NEAR(start_at(7312.34 - 490.0, 8000.0), 7312.34, close_hz);
    EXPECT_NEAR(start_at(7312.34 - 240.0, 1000.0), 7312.34, close_hz);
    EXPECT_DOUBLE_EQ(start_at(7312.34 - 260.0, 1000.0), 7312.34 - 260.0); // nothing near: as given
    EXPECT_DOUBLE_EQ(start_at(7312.34 - 510.0, 8000.0), 7312.34 - 510.0);
}

TEST(SignalSearch, RefusesACarrierThatCannotBeMeasured) {
    scene s = quiet_scene({modulated(7312.34, -20.0, 1013.7)});
    const auto without_centre = caught([&] { search(s, {.carrier = signed_hz{145.2e6, false}}); });
    EXPECT_EQ(without_centre.exit_status, 2);
    EXPECT_TRUE(without_centre.says("--centre"));
    s.centre_hz = 145.2e6;
    for (const signed_hz outside : {signed_hz{24'001.0, true}, signed_hz{-24'001.0, true},
                                    signed_hz{145.3e6, false}, signed_hz{7312.0, false}}) {
        EXPECT_EQ(caught([&] { search(s, {.carrier = outside}); }).exit_status, 3) << outside.hz;
    }
    s.format = parse_sample_format("ri16_le").value();
    EXPECT_EQ(caught([&] { search(s, {.carrier = signed_hz{-5000.0, true}}); }).exit_status, 3);
}

TEST(SignalSearch, AGivenToneIsTakenWithinTwoPercent) {
    scene_carrier c = modulated(7312.34, -20.0, 1013.7, 10.0);
    c.tones.push_back({.frequency_hz = 2500.0, .depth_percent = 60.0});
    const scene s = quiet_scene({c});
    expect_found(search(s), 7312.34, 2500.0);
    expect_found(search(s, {.tone_hz = 1000.0}), 7312.34, 1013.7);
    expect_found(search(s, {.carrier = signed_hz{7300.0, true}, .tone_hz = 1030.0}), 7312.34,
                 1013.7);
    EXPECT_DOUBLE_EQ(search(s, {.tone_hz = 990.0}).tone_hz.value(), 990.0); // 2.4 % off: as given
    const found_signal two_hertz =
        search(quiet_scene({modulated(7312.34, -20.0, 31.8)}), {.tone_hz = 30.0});
    expect_found(two_hertz, 7312.34, 31.8);
}

TEST(SignalSearch, RefusesAToneOutsideTheBand) {
    const scene s = quiet_scene({modulated(17'312.34, -20.0, 1013.7)});
    const auto failure = caught([&] { search(s, {.tone_hz = 7000.0}); });
    EXPECT_EQ(failure.exit_status, 3);
    EXPECT_TRUE(failure.says("--tone 7k"));
}

// How wide

TEST(SignalSearch, WidthFollowsTheTone) {
    const auto width_with = [](double tone_hz) {
        return search(quiet_scene({modulated(3312.34, -20.0, tone_hz)})).width_hz;
    };
    EXPECT_NEAR(width_with(2000.0), 12'000.0, 1.0);
    EXPECT_DOUBLE_EQ(width_with(100.0), 2000.0); // never below
    EXPECT_DOUBLE_EQ(search(quiet_scene({pure(3312.34)})).width_hz, 20e3);
}

TEST(SignalSearch, AnAutomaticWidthShrinksAndAGivenOneDoesNot) {
    // 24 kHz - 21.3 kHz = 2.7 kHz above the carrier: 5.4 kHz are there.
    const scene tight = quiet_scene({modulated(21'300.0, -20.0, 1013.7)});
    const found_signal f = search(tight);
    EXPECT_NEAR(f.width_hz, 5400.0, 0.2);
    EXPECT_TRUE(has(f, note_code::channel_narrowed));
    EXPECT_FALSE(has(search(quiet_scene({modulated(20'950.0, -20.0, 1013.7)})),
                     note_code::channel_narrowed));
    EXPECT_NEAR(search(tight, {.width_hz = 5390.0}).width_hz, 5390.0, 1e-9);
    const auto failure = caught([&] { search(tight, {.width_hz = 5410.0}); });
    EXPECT_EQ(failure.exit_status, 3);
    EXPECT_TRUE(failure.says("--width 5410"));
    EXPECT_TRUE(failure.says("5.4 kHz"));
}

// The receiver's own lines in the channel

TEST(SignalSearch, SaysWhenDirectCurrentStandsInTheChannel) {
    scene s = quiet_scene({modulated(2500.0, -20.0, 1013.7)});
    EXPECT_FALSE(has(search(s), note_code::dc_in_channel));
    s.receiver.dc_dbfs = -79.0; // 59 dB below the carrier
    const found_signal f = search(s);
    EXPECT_TRUE(has(f, note_code::dc_in_channel));
    EXPECT_NE(text_of(f, note_code::dc_in_channel).find("-59."), std::string::npos);
    EXPECT_NEAR(f.dc_amplitude, std::pow(10.0, -79.0 / 20.0), 2e-5);
    EXPECT_FALSE(has(f, note_code::image_in_channel));
    s.receiver.dc_dbfs = -81.0;
    EXPECT_FALSE(has(search(s), note_code::dc_in_channel));
    s.receiver.dc_dbfs = -30.0; // DC is strong, but stands outside
    s.carriers.front().offset_hz = 6200.0;
    EXPECT_FALSE(has(search(s), note_code::dc_in_channel));
    s.carriers.front().offset_hz = 2500.0; // squared, DC looks like an image: it is none
    EXPECT_FALSE(has(search(s), note_code::image_in_channel));
}

TEST(SignalSearch, SaysWhenTheImageStandsInTheChannel) {
    // Image ratio of a gain error g: (g - 1)/(g + 1), 0.0174 dB for -60 dB.
    scene s = quiet_scene({modulated(2500.0, -20.0, 1013.7)});
    EXPECT_FALSE(has(search(s), note_code::image_in_channel));
    s.receiver.iq_gain_error_db = 0.021;
    const found_signal f = search(s);
    EXPECT_TRUE(has(f, note_code::image_in_channel));
    EXPECT_NEAR(f.image_ratio, 0.021 / 20.0 * std::log(10.0) / 2.0, 1e-4);
    s.receiver.iq_gain_error_db = 0.014;
    EXPECT_FALSE(has(search(s), note_code::image_in_channel));
    s.receiver.iq_gain_error_db = 1.0; // strong, but 7 kHz from the carrier
    s.carriers.front().offset_hz = 3500.0;
    EXPECT_FALSE(has(search(s), note_code::image_in_channel));
}

TEST(SignalSearch, CleanScenesNeverComplainOfTheReceiver) {
    random_stream draw{20260504};
    for (int k = 0; k < 40; ++k) {
        scene s = quiet_scene({modulated(draw.uniform(-5000.0, 5000.0), -20.0,
                                         draw.uniform(100.0, 3000.0), draw.uniform(10.0, 95.0))});
        s.duration_s = draw.uniform(0.5, 2.0);
        s.seed = static_cast<std::uint64_t>(k) + 1;
        s.receiver.noise_dbfs_hz = draw.uniform(-140.0, -60.0); // down to a C/N of 0 dB in 10 kHz
        const search_request as_given{.carrier = signed_hz{s.carriers.front().offset_hz, true},
                                      .tone_hz = s.carriers.front().tones.front().frequency_hz};
        const found_signal f = search(s, as_given);
        EXPECT_FALSE(has(f, note_code::dc_in_channel)) << k;
        EXPECT_FALSE(has(f, note_code::image_in_channel)) << k;
    }
}

// Random signals, none of them commensurate with anything.
TEST(CoverageSignalSearch, FindsRandomCarriersAndTonesToATwentiethOfAHertz) {
    random_stream draw{20260504};
    int lost = 0;
    for (int k = 0; k < 200; ++k) {
        scene s;
        s.format = parse_sample_format("cf32_le").value();
        s.rate_hz = 8e3 * std::exp(draw.uniform() * std::log(3e6 / 8e3));
        s.duration_s = s.rate_hz > 4e5 ? 1.0 : 2.0;
        s.seed = static_cast<std::uint64_t>(k) + 1;
        const double places[] = {draw.uniform(-0.2, 0.2), draw.uniform(-0.44, 0.44),
                                 draw.uniform() < 0.5 ? 0.45 : -0.45}; // 5 % from the edge
        const double offset_hz = s.rate_hz * places[k % 3] + draw.uniform(-1.0, 1.0);
        const double room_hz = s.rate_hz / 2.0 - std::abs(offset_hz);
        const double tone_hz =
            std::exp(draw.uniform(std::log(30.0), std::log(std::min(8000.0, 0.9 * room_hz))));
        s.carriers = {
            modulated(offset_hz, draw.uniform(-60.0, -10.0), tone_hz, draw.uniform(6.0, 95.0))};
        s.receiver.noise_dbfs_hz = s.carriers.front().level_dbfs - 60.0 - 10.0 * std::log10(20e3);
        SCOPED_TRACE(testing::Message() << k << ": rate " << s.rate_hz << ", offset " << offset_hz
                                        << ", tone " << tone_hz);
        const found_signal f = search(s);
        EXPECT_NEAR(f.offset_hz, offset_hz, close_hz);
        EXPECT_NEAR(f.tone_hz.value_or(0.0), tone_hz, close_hz);
        EXPECT_EQ(f.carriers.size(), 1u);
        lost += f.tone_hz ? 0 : 1;
    }
    EXPECT_EQ(lost, 0);
}

} // namespace
} // namespace tonewalk
