// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/scene/truth.hpp"

#include <cmath>
#include <vector>

#include <gtest/gtest.h>

#include "projection.hpp"
#include "tonewalk/scene/generator.hpp"

namespace {

using namespace tonewalk;
using test::db;

TEST(SceneTruth, MeanCarrierIsWhatAHannProjectionReads) {
    const scene whole{
        .rate_hz = 48000.0,
        .centre_hz = 433.92e6,
        .duration_s = 3.0,
        .carriers = {{.offset_hz = 5000.0,
                      .level_dbfs = -10.0,
                      .tones = {{.depth_percent = 60.0}},
                      .waves = {{.amplitude = 0.9},
                                {.amplitude = 0.6, .phase_deg = 30.0, .direction_deg = 170.0},
                                {.amplitude = 0.2, .direction_deg = 90.0, .delay_s = 2e-5}},
                      .polarization =
                          scene_polarization{.axial_ratio_db = 12.0, .tilt_deg = 20.0}}},
        .path = {.speed_m_s = 0.7, .rotation_deg_s = 40.0}};
    const std::vector<cf64> made = render_samples(whole);
    const scene_truth truth{whole};
    constexpr std::size_t window = 4800;
    for (std::size_t first = 0; first + window <= made.size(); first += 7000) {
        const double start_s = static_cast<double>(first) / 48000.0;
        const double read =
            std::abs(test::hann_line(std::span{made}.subspan(first, window), 48000.0, 5000.0));
        EXPECT_NEAR(read, std::abs(truth.mean_carrier(0, start_s, 0.1)), 2e-6) << start_s;
    }
}

TEST(SceneTruth, LevelsIncludeFadesAndGainSteps) {
    const scene whole{
        .duration_s = 1.0,
        .carriers = {{.level_dbfs = -20.0,
                      .start_s = 0.2,
                      .tones = {{.depth_percent = 40.0}, {.depth_percent = 10.0, .start_s = 0.6}},
                      .fades = {{0.0, 0.0}, {1.0, -10.0}}}},
        .receiver = {.gain_steps = {{0.5, -3.0}}}};
    EXPECT_FALSE(truth_at(whole, 0, 0.1).on);
    EXPECT_EQ(truth_at(whole, 0, 0.1).carrier_amplitude, 0.0);
    EXPECT_NEAR(db(truth_at(whole, 0, 0.4).carrier_amplitude), -24.0, 1e-9);
    EXPECT_NEAR(db(truth_at(whole, 0, 0.7).carrier_amplitude), -30.0, 1e-9);
    EXPECT_NEAR(db(truth_at(whole, 0, 0.7).tone_amplitudes[0]), -30.0 + db(0.4), 1e-9);
    EXPECT_EQ(truth_at(whole, 0, 0.4).tone_amplitudes[1], 0.0);
    EXPECT_NEAR(db(truth_at(whole, 0, 0.7).tone_amplitudes[1]), -50.0, 1e-9);
}

TEST(SceneTruth, LineAmplitudeKnowsIncidentalPhase) {
    const scene whole{
        .samples = 48000,
        .carriers = {
            {.level_dbfs = 0.0,
             .tones = {{.frequency_hz = 700.0,
                        .depth_percent = 50.0,
                        .incidental_rad = 0.3,
                        .incidental_phase_deg = 25.0},
                       {.frequency_hz = 1300.0, .depth_percent = 20.0, .incidental_rad = 0.1}}}}};
    const std::vector<cf64> made = render_samples(whole);
    EXPECT_NEAR(truth_at(whole, 0, 0.5).line_amplitude, std::abs(test::line(made, 48000.0, 0.0)),
                1e-9);
}

// AM-26: computed; mean 1.03390, fundamental 1.14609 of it.
TEST(SceneTruth, LineAndToneKnowThePinchOff) {
    const scene whole{.samples = 48000,
                      .carriers = {{.level_dbfs = 0.0,
                                    .overmodulation = overmodulation::pinch_off,
                                    .tones = {{.depth_percent = 125.0}}}}};
    const carrier_truth truth = truth_at(whole, 0, 0.5);
    EXPECT_NEAR(truth.carrier_amplitude, 1.0, 1e-12);
    EXPECT_NEAR(truth.line_amplitude, 1.03390, 5e-6);
    EXPECT_NEAR(truth.tone_amplitudes[0] / truth.line_amplitude, 1.14609, 5e-6);
}

TEST(SceneTruth, ExtremaIgnoreShallowRippleAndTheEnds) {
    const auto with_fades = [](std::vector<scene_point> fades) {
        return scene_truth{{.duration_s = 3.0, .carriers = {{.fades = std::move(fades)}}}}.extrema(
            0);
    };
    EXPECT_TRUE(with_fades({{0.0, 0.0}, {1.0, -2.5}, {2.0, 0.0}, {3.0, -2.5}}).empty());
    const auto found = with_fades({{0.0, 0.0}, {1.0, -20.0}, {2.0, -5.0}, {3.0, -30.0}});
    ASSERT_EQ(found.size(), 2U);
    EXPECT_FALSE(found[0].is_peak);
    EXPECT_NEAR(found[0].time_s, 1.0, 1e-6);
    EXPECT_NEAR(found[0].level_dbfs, -26.0, 1e-4);
    EXPECT_TRUE(found[1].is_peak);
    EXPECT_NEAR(found[1].time_s, 2.0, 1e-6);
    EXPECT_NEAR(found[1].level_dbfs, -11.0, 1e-4);
}

} // namespace
