// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/channel/iq_balance.hpp"

#include <cmath>
#include <numbers>

#include <gtest/gtest.h>

#include "scene_search.hpp"
#include "tonewalk/base/random.hpp"
#include "tonewalk/channel/recording_survey.hpp"

namespace tonewalk {
namespace {

using test::modulated;
using test::pure;
using test::quiet_scene;
using test::source_of;

constexpr double close_db = 0.01, close_deg = 0.05;

std::optional<iq_balance> fit(const scene& s) {
    test::memory_source source = source_of(s);
    return survey_recording(source).balance;
}

scene unequal(std::vector<scene_carrier> carriers, double gain_db = 0.8, double phase_deg = -2.5) {
    scene s = quiet_scene(std::move(carriers));
    s.receiver.iq_gain_error_db = gain_db;
    s.receiver.iq_phase_error_deg = phase_deg;
    return s;
}

void expect_recovered(const scene& s) {
    const auto found = fit(s);
    ASSERT_TRUE(found.has_value());
    const double gain_off = found->gain_error_db - s.receiver.iq_gain_error_db;
    const double phase_off = found->phase_error_deg - s.receiver.iq_phase_error_deg;
    EXPECT_NEAR(gain_off, 0.0, close_db);
    EXPECT_NEAR(phase_off, 0.0, close_deg);
    EXPECT_LE(std::abs(gain_off), 2.0 * found->gain_error_db_u95);
    EXPECT_LE(std::abs(phase_off), 2.0 * found->phase_error_deg_u95);
    EXPECT_LT(found->gain_error_db_u95, close_db);
    EXPECT_LT(found->phase_error_deg_u95, close_deg);
}

// I = g cos wt, Q = sin(wt + e), whose line and image come from two instants, not from the formula
// under test.
TEST(IqBalance, GainAndPhaseAreThoseOfTheComponents) {
    for (const double gain_db : {-3.0, -0.1, 0.0, 0.4, 2.0}) {
        for (const double phase_deg : {-8.0, 0.0, 0.3, 12.0}) {
            const double gain = std::pow(10.0, gain_db / 20.0);
            const double e = phase_deg * std::numbers::pi / 180.0;
            const auto z = [&](double t) { return cf64{gain * std::cos(t), std::sin(t + e)}; };
            // z(0) = a + b, z(quarter turn) = j (a - b); the image is b over conj(a).
            const cf64 sum = z(0.0), difference = z(std::numbers::pi / 2.0) / cf64{0.0, 1.0};
            const cf64 a = (sum + difference) / 2.0, b = (sum - difference) / 2.0;
            const iq_balance found = balance_from_image(b / std::conj(a), 0.0);
            EXPECT_NEAR(found.gain_error_db, gain_db, 1e-12);
            EXPECT_NEAR(found.phase_error_deg, phase_deg, 1e-12);
        }
    }
}

TEST(IqBalance, UncertaintyOfGainAndPhaseFollowsThatOfTheImage) {
    const cf64 k{0.03, -0.02};
    constexpr double u95 = 1e-4;
    const iq_balance found = balance_from_image(k, u95);
    const iq_balance more_gain = balance_from_image(k + u95, 0.0);
    const iq_balance more_phase = balance_from_image(k + cf64{0.0, u95}, 0.0);
    const auto moved = [&](const iq_balance& b) {
        return std::hypot(b.gain_error_db - found.gain_error_db,
                          (b.phase_error_deg - found.phase_error_deg) * 20.0 / std::log(10.0) *
                              std::numbers::pi / 180.0);
    };
    EXPECT_NEAR(moved(more_gain), found.gain_error_db_u95, 1e-6);
    EXPECT_NEAR(moved(more_phase), found.gain_error_db_u95, 1e-6);
    EXPECT_NEAR(found.phase_error_deg_u95 / found.gain_error_db_u95,
                180.0 / std::numbers::pi / (20.0 / std::log(10.0)), 1e-12);
}

TEST(IqBalance, IsRecoveredFromAModulatedCarrier) {
    expect_recovered(unequal({modulated(7312.34)}));
    expect_recovered(unequal({modulated(-7312.34)}, -0.05, 0.2));
    expect_recovered(unequal({modulated(7312.34)}, 0.0, 0.0));
    expect_recovered(unequal({pure(7312.34)}, 3.0, 10.0));
}

TEST(IqBalance, IsRecoveredBesideDirectCurrentAndAtTheBandsEdge) {
    scene s = unequal({modulated(7312.34)});
    s.receiver.dc_dbfs = -10.0;
    expect_recovered(s);
    s.carriers = {modulated(-22'900.0)};
    expect_recovered(s);
    s.carriers = {modulated(60.0)};
    s.receiver.dc_dbfs = -20.0;
    expect_recovered(s);
}

TEST(IqBalance, IsRecoveredThroughFades) {
    scene_carrier c = modulated(7312.34);
    c.waves = {{.amplitude = 1.0, .direction_deg = 0.0},
               {.amplitude = 0.998, .phase_deg = 70.0, .direction_deg = 180.0}};
    for (const double speed_m_s : {0.5, 5.0, 30.0}) {
        scene s = unequal({c});
        s.centre_hz = 145e6;
        s.path.speed_m_s = speed_m_s;
        expect_recovered(s);
    }
}

TEST(IqBalance, IsRecoveredFromSeveralCarriersAndSpeech) {
    expect_recovered(
        unequal({modulated(7312.34), modulated(-11'021.0, -30.0, 700.0), pure(3000.0, -25.0)}));
    scene_carrier c = pure(5000.0);
    c.speech_percent = 80.0;
    expect_recovered(unequal({c}));
}

// The carrier's mirror place is taken by its own lower sideband.
TEST(IqBalance, ASidebandInTheMirrorPlaceIsNotAnImage) {
    for (const double off_hz : {0.0, 0.2, 1.0, 6.0, 20.0}) {
        expect_recovered(unequal({modulated(500.0 + off_hz / 2.0)}));
    }
}

// It turns against the carrier, and its scatter counts whole; further off it is another line,
// beside which nothing shows the image.
TEST(IqBalance, ASignalInTheMirrorPlaceWidensTheUncertainty) {
    for (const double level_dbfs : {-35.0, -50.0, -70.0}) {
        const double twin = std::pow(10.0, (level_dbfs + 20.0) / 20.0);
        for (const double away_hz : {0.3, 0.8, 2.0, -1.1}) {
            SCOPED_TRACE(testing::Message() << level_dbfs << " dBFS, " << away_hz << " Hz away");
            const auto found =
                fit(quiet_scene({pure(7312.34), pure(-7312.34 + away_hz, level_dbfs)}));
            ASSERT_TRUE(found.has_value());
            EXPECT_LE(std::abs(found->gain_error_db), found->gain_error_db_u95);
            EXPECT_LE(std::abs(found->phase_error_deg), found->phase_error_deg_u95);
            EXPECT_GT(found->image_ratio_u95, 0.7 * twin);
        }
        const auto beside = fit(quiet_scene({pure(7312.34), pure(-7300.0, level_dbfs)}));
        EXPECT_TRUE(!beside || beside->gain_error_db_u95 < close_db);
    }
}

// Locked to the carrier, it keeps its phase; the sidebands have no such companion.
TEST(IqBalance, ALockedSignalInTheMirrorPlaceDisagreesWithTheSidebands) {
    const scene s = quiet_scene({modulated(7312.34), pure(-7312.34, -55.0)});
    const auto found = fit(s);
    ASSERT_TRUE(found.has_value());
    EXPECT_LE(std::abs(found->gain_error_db), found->gain_error_db_u95);
    EXPECT_LE(std::abs(found->phase_error_deg), found->phase_error_deg_u95);
    EXPECT_GT(found->gain_error_db_u95, 0.03);
}

TEST(IqBalance, NothingShowsItNearTheCentreInNoiseOrInRealSamples) {
    EXPECT_FALSE(fit(quiet_scene({pure(10.0)})).has_value());
    EXPECT_FALSE(fit(quiet_scene({})).has_value());
    scene s = quiet_scene({modulated(7312.34)});
    s.format = parse_sample_format("ri16_le").value();
    EXPECT_FALSE(fit(s).has_value());
    s = quiet_scene({pure(7312.34, -60.0)});
    s.receiver.noise_dbfs_hz = -78.0; // 18 dB over the noise of 1 Hz
    EXPECT_FALSE(fit(s).has_value());
}

TEST(CoverageIqBalance, IntervalsHoldTheTruth) {
    random_stream draw{4711};
    int gains_held = 0, phases_held = 0, fits = 0;
    for (std::uint64_t seed = 1; seed <= 1000; ++seed) {
        const double tone_hz = draw.uniform(200.0, 1500.0);
        scene s = unequal({modulated(draw.uniform(-3000.0, 3000.0), -20.0, tone_hz)},
                          draw.uniform(-1.0, 1.0), draw.uniform(-5.0, 5.0));
        s.rate_hz = 12e3;
        s.seed = seed;
        s.receiver.noise_dbfs_hz = draw.uniform(-120.0, -60.0);
        if (const auto found = fit(s)) {
            ++fits;
            gains_held += std::abs(found->gain_error_db - s.receiver.iq_gain_error_db) <=
                                  found->gain_error_db_u95
                              ? 1
                              : 0;
            phases_held += std::abs(found->phase_error_deg - s.receiver.iq_phase_error_deg) <=
                                   found->phase_error_deg_u95
                               ? 1
                               : 0;
        }
    }
    EXPECT_GE(fits, 980); // some carriers stand too near the centre
    for (const int held : {gains_held, phases_held}) {
        EXPECT_GE(held, 0.93 * fits);
        EXPECT_LE(held, 0.97 * fits);
    }
}

} // namespace
} // namespace tonewalk
