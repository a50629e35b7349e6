// SPDX-License-Identifier: GPL-3.0-or-later
#include <algorithm>
#include <cmath>
#include <vector>

#include <gtest/gtest.h>

#include "projection.hpp"
#include "tonewalk/scene/generator.hpp"
#include "tonewalk/scene/truth.hpp"

namespace {

using namespace tonewalk;
using test::db;
using test::line;

constexpr double light_m_s = 299792458.0;

/// A walk of 1 m/s through a wave and its reflection.
scene standing_wave(double reflection, double centre_hz = 433.92e6, double incidence_deg = 0.0) {
    return {.rate_hz = 48000.0,
            .centre_hz = centre_hz,
            .duration_s = 2.0,
            .truth_every_s = 0.001,
            .carriers = {{.level_dbfs = 0.0,
                          .waves = {{.amplitude = 1.0, .direction_deg = incidence_deg},
                                    {.amplitude = reflection,
                                     .phase_deg = 50.0,
                                     .direction_deg = 180.0 - incidence_deg}}}},
            .path = {.speed_m_s = 1.0}};
}

struct swr_row {
    const char* id;
    double swr_db, reflection;
};
// SW-1 to SW-12: computed from |reflection| = (S-1)/(S+1), printed to three and five decimals.
constexpr swr_row swr_rows[] = {
    {"SW-1", 0.424, 0.02439},   {"SW-2", 0.828, 0.04762},   {"SW-3", 1.584, 0.09091},
    {"SW-4", 3.522, 0.20000},   {"SW-5", 5.688, 0.31623},   {"SW-6", 6.021, 0.33333},
    {"SW-7", 7.959, 0.42857},   {"SW-8", 9.542, 0.50000},   {"SW-9", 12.041, 0.60000},
    {"SW-10", 13.979, 0.66667}, {"SW-11", 20.000, 0.81818}, {"SW-12", 30.000, 0.93869}};

TEST(StandingWave, TwoMovingWavesGiveTheTextbookRatio) {
    for (const swr_row& row : swr_rows) {
        double highest = 0.0, lowest = 10.0;
        for (const cf64& z : render_samples(standing_wave(row.reflection))) {
            highest = std::max(highest, std::abs(z));
            lowest = std::min(lowest, std::abs(z));
        }
        // The reflection is printed to five decimals: at SWR 31.6 that is 0.0014 dB.
        const double printed = 5e-4 + 8.7 * 5e-6 / (1.0 - row.reflection) * 2.0;
        EXPECT_NEAR(db(highest / lowest), row.swr_db, printed) << row.id;
    }
}

std::vector<double> null_positions_m(const std::vector<cf64>& samples, double rate_hz) {
    std::vector<double> found;
    for (std::size_t k = 1; k + 1 < samples.size(); ++k) {
        const double before = std::norm(samples[k - 1]), here = std::norm(samples[k]),
                     after = std::norm(samples[k + 1]);
        if (here < before && here <= after)
            found.push_back(
                (static_cast<double>(k) + 0.5 * (before - after) / (before - 2.0 * here + after)) /
                rate_hz); // 1 m/s
    }
    return found;
}

double mean_spacing_m(const std::vector<double>& positions) {
    return (positions.back() - positions.front()) / static_cast<double>(positions.size() - 1);
}

// SW-20: half a wavelength, computed, printed to a micrometre.
TEST(StandingWave, NullsLieHalfAWavelengthApart) {
    const std::pair<double, double> rows[] = {
        {127e6, 1180.285}, {433.92e6, 345.447}, {900e6, 166.551}, {2450e6, 61.182}};
    for (const auto& [frequency_hz, spacing_mm] : rows) {
        scene whole = standing_wave(0.7, frequency_hz);
        whole.duration_s = frequency_hz < 200e6 ? 5.0 : 2.0;
        const double spacing_m = mean_spacing_m(null_positions_m(render_samples(whole), 48000.0));
        EXPECT_NEAR(1e3 * spacing_m, spacing_mm, 6e-4) << frequency_hz;
    }
}

// SW-21: oblique reflection, walking along the normal: wavelength / (2 cos a).
TEST(StandingWave, ObliqueWavesSpreadTheNulls) {
    const double wavelength_m = light_m_s / 900e6;
    const std::pair<double, double> rows[] = {{30.0, 0.57735}, {45.0, 0.70711}, {60.0, 1.0}};
    for (const auto& [angle_deg, wavelengths] : rows) {
        const auto nulls =
            null_positions_m(render_samples(standing_wave(0.7, 900e6, angle_deg)), 48000.0);
        EXPECT_NEAR(mean_spacing_m(nulls) / wavelength_m, wavelengths, 2e-5) << angle_deg;
    }
}

TEST(StandingWave, TruthKnowsEveryPeakAndNull) {
    const scene whole = standing_wave(0.8);
    const std::vector<scene_truth::extremum> extrema = scene_truth{whole}.extrema(0);
    std::vector<double> nulls;
    for (const scene_truth::extremum& each : extrema) {
        if (!each.is_peak)
            nulls.push_back(each.time_s);
        EXPECT_NEAR(each.level_dbfs, db(each.is_peak ? 1.8 : 0.2), 1e-9);
    }
    const std::vector<double> seen = null_positions_m(render_samples(whole), 48000.0);
    ASSERT_EQ(nulls.size(), seen.size());
    for (std::size_t k = 0; k < nulls.size(); ++k)
        EXPECT_NEAR(nulls[k], seen[k], 2e-6);
}

TEST(Path, PointsInTimeMoveTheReceiver) {
    scene whole = standing_wave(0.5);
    whole.path = {.points = {{0.5, 0.0}, {1.0, 0.25}, {1.5, 0.25}}};
    const std::vector<cf64> made = render_samples(whole);
    const double per_m = 2.0 * M_PI * 433.92e6 / light_m_s;
    const auto field = [&](double x) {
        return std::abs(std::polar(1.0, -per_m * x) +
                        std::polar(0.5, 50.0 * M_PI / 180.0 + per_m * x));
    };
    EXPECT_NEAR(std::abs(made[0]), field(0.0), 1e-12);
    EXPECT_NEAR(std::abs(made[36000]), field(0.125), 1e-12);
    EXPECT_NEAR(std::abs(made[60000]), field(0.25), 1e-12);
    EXPECT_NEAR(std::abs(made[95999]), field(0.25), 1e-12);
}

// Doppler: the wave that comes towards the walker stands v/wavelength higher.
TEST(Path, MovingShiftsTheFrequency) {
    scene whole = standing_wave(0.0);
    whole.carriers[0].waves = {{.direction_deg = 180.0}};
    whole.path.speed_m_s = 30.0;
    const std::vector<cf64> made = render_samples(whole);
    const double step = std::arg(made[5001] * std::conj(made[5000]));
    EXPECT_NEAR(step * 48000.0 / (2.0 * M_PI), 30.0 * 433.92e6 / light_m_s, 1e-6);
}

TEST(Path, ADelayedWaveCarriesItsModulationLate) {
    constexpr double delay_s = 130e-6;
    const scene whole{.samples = 48000,
                      .carriers = {{.offset_hz = 2000.0,
                                    .level_dbfs = 0.0,
                                    .tones = {{.depth_percent = 60.0}},
                                    .waves = {{.delay_s = delay_s}}}}};
    const std::vector<cf64> made = render_samples(whole);
    for (const double hz : {1000.0, 2000.0, 3000.0}) {
        const std::complex<double> truth =
            std::polar(hz == 2000.0 ? 1.0 : 0.3, -2.0 * M_PI * hz * delay_s);
        EXPECT_NEAR(std::abs(line(made, 48000.0, hz) - truth), 0.0, 1e-12) << hz;
    }
}

// Two equal waves, half a tone cycle apart in time: both sidebands vanish, the carrier doubles.
TEST(Path, ALongDelayFadesTheSidebandsAlone) {
    const scene whole{.samples = 48000,
                      .carriers = {{.level_dbfs = 0.0,
                                    .tones = {{.depth_percent = 60.0}},
                                    .waves = {{}, {.delay_s = 0.5e-3}}}}};
    const std::vector<cf64> made = render_samples(whole);
    EXPECT_NEAR(std::abs(line(made, 48000.0, 0.0)), 2.0, 1e-12);
    EXPECT_NEAR(std::abs(line(made, 48000.0, 1000.0)), 0.0, 1e-12);
    const carrier_truth truth = truth_at(whole, 0, 0.5);
    EXPECT_NEAR(truth.carrier_amplitude, 2.0, 1e-12);
    EXPECT_NEAR(truth.tone_amplitudes[0], 0.0, 1e-12);
}

TEST(Path, DelayedPhaseNoiseIsTheSameWalkLater) {
    constexpr double rate_hz = 48000.0;
    scene prompt{.rate_hz = rate_hz,
                 .samples = 2000,
                 .carriers = {{.level_dbfs = 0.0,
                               .phase_noise_dbc_hz = -60.0,
                               .waves = {{}, {.amplitude = 0.0, .delay_s = 10.0 / rate_hz}}}}};
    scene late = prompt;
    late.carriers[0].waves[0].amplitude = 0.0;
    late.carriers[0].waves[1].amplitude = 1.0;
    const std::vector<cf64> first = render_samples(prompt), second = render_samples(late);
    for (std::size_t k = 10; k < first.size(); ++k)
        ASSERT_NEAR(std::abs(second[k] - first[k - 10]), 0.0, 1e-9);
}

TEST(Fades, AreStraightInDecibels) {
    const std::vector<cf64> made = render_samples(
        {.duration_s = 1.0,
         .carriers = {{.level_dbfs = -10.0, .fades = {{0.25, 0.0}, {0.75, -30.0}}}}});
    EXPECT_NEAR(db(std::abs(made[0])), -10.0, 1e-12);
    EXPECT_NEAR(db(std::abs(made[24000])), -25.0, 1e-12);
    EXPECT_NEAR(db(std::abs(made[47999])), -40.0, 1e-12);
}

/// |z| in dB while the probe turns at 1 degree in 100 samples.
std::vector<double> turning_levels_db(const scene_polarization& field) {
    const std::vector<cf64> made =
        render_samples({.rate_hz = 1000.0,
                        .samples = 18100,
                        .carriers = {{.level_dbfs = 0.0, .polarization = field}},
                        .path = {.rotation_deg_s = 10.0}});
    std::vector<double> levels_db;
    for (std::size_t k = 0; k < made.size(); k += 50)
        levels_db.push_back(db(std::abs(made[k])));
    return levels_db; // every half degree
}

// POL-1: -20 log cos, computed, printed to three decimals.
TEST(Polarization, LinearProbesLoseTheCosineOfTheirAngle) {
    const std::pair<double, double> rows[] = {
        {0, 0},       {5, 0.033},   {10, 0.133},  {15, 0.301}, {20, 0.540},  {22.5, 0.688},
        {30, 1.249},  {45, 3.010},  {60, 6.021},  {70, 9.319}, {75, 11.740}, {80, 15.207},
        {85, 21.194}, {87, 25.624}, {88, 29.144}, {89, 35.163}};
    const std::vector<double> levels_db = turning_levels_db({});
    for (const auto& [angle_deg, loss_db] : rows)
        EXPECT_NEAR(-levels_db[static_cast<std::size_t>(2.0 * angle_deg)], loss_db, 5e-4);
    EXPECT_LT(levels_db[180], -250.0);
}

struct ellipse_row {
    const char* id;
    double axial_ratio_db, tilt_deg, levels_db[4]; // at 0, 45, 90, 135 degrees
};
// POL-30 to POL-33: computed from the Stokes parameters, printed to three decimals.
constexpr ellipse_row ellipse_rows[] = {{"POL-30", 3, 30, {-2.343, -1.912, -3.799, -4.484}},
                                        {"POL-31", 6, 20, {-1.371, -1.597, -5.674, -5.119}},
                                        {"POL-32", 20, -15, {-0.341, -5.935, -11.217, -1.278}},
                                        {"POL-33", 40, 60, {-6.020, -0.302, -1.250, -11.734}}};

TEST(Polarization, EllipsesGiveTheLevelsOfTheirStokesParameters) {
    for (const ellipse_row& row : ellipse_rows) {
        const std::vector<double> levels_db =
            turning_levels_db({.axial_ratio_db = row.axial_ratio_db, .tilt_deg = row.tilt_deg});
        for (std::size_t k = 0; k < 4; ++k)
            EXPECT_NEAR(levels_db[90 * k], row.levels_db[k], 6e-4) << row.id << ", " << 45 * k;
    }
}

TEST(Polarization, AProbesIsolationFillsTheNull) {
    const std::vector<double> levels_db = turning_levels_db({.isolation_db = 25.0});
    EXPECT_NEAR(levels_db[180], -25.0, 1e-9);
    EXPECT_NEAR(levels_db[0], 0.0, 1e-9);
}

// A thin half-wave dipole is 78 degrees wide at half power (Balanis, Antenna Theory, from memory).
TEST(Pattern, HalfWaveDipoleAndCardioidHaveTheirKnownWidths) {
    scene whole{.rate_hz = 1000.0,
                .samples = 36001,
                .carriers = {{.level_dbfs = 0.0, .pattern = scene_pattern{.bearing_deg = 100.0}}},
                .path = {.rotation_deg_s = 10.0}}; // 0.01 degree a sample
    const auto level_db = [](const std::vector<cf64>& made, double angle_deg) {
        return db(std::abs(made[static_cast<std::size_t>(std::lround(100.0 * angle_deg))]));
    };
    std::vector<cf64> made = render_samples(whole);
    EXPECT_NEAR(level_db(made, 100.0), 0.0, 1e-12);
    EXPECT_NEAR(level_db(made, 100.0 - 39.04), -3.010, 2e-3);
    EXPECT_NEAR(level_db(made, 100.0 + 39.04), -3.010, 2e-3);
    EXPECT_NEAR(level_db(made, 280.0), 0.0, 1e-12);
    EXPECT_LT(level_db(made, 190.0), -200.0);
    whole.carriers[0].pattern = scene_pattern{
        .kind = scene_pattern::shape::cardioid, .bearing_deg = 100.0, .front_to_back_db = 20.0};
    made = render_samples(whole);
    EXPECT_NEAR(level_db(made, 100.0), 0.0, 1e-12);
    EXPECT_NEAR(level_db(made, 280.0), -20.0, 1e-9);
}

// RES-10: 1/(1 + x^2), x = 2 Q (f - f0)/f0; computed, printed to three decimals.
TEST(Resonator, LinesFollowTheLorentzian) {
    constexpr double resonance_hz = 100e6, q_loaded = 50000.0; // 2 kHz wide
    const std::pair<double, double> rows[] = {{0.25, -0.263}, {0.5, -0.969}, {1, -3.010},
                                              {2, -6.990},    {3, -10.000},  {5, -14.150},
                                              {10, -20.043}};
    for (const auto& [x, level_db] : rows) {
        const scene whole{
            .centre_hz = resonance_hz,
            .samples = 48000,
            .carriers = {{.offset_hz = 1000.0 * x, .level_dbfs = 0.0}},
            .path = {.resonator = scene_resonator{
                         .modes = {{.frequency_hz = resonance_hz, .q_loaded = q_loaded}}}}};
        EXPECT_NEAR(db(std::abs(line(render_samples(whole), 48000.0, 1000.0 * x))), level_db, 5e-4)
            << x;
        EXPECT_NEAR(db(truth_at(whole, 0, 0.0).carrier_amplitude), level_db, 5e-4) << x;
    }
}

TEST(Resonator, ShapesEachSidebandByItself) {
    constexpr double resonance_hz = 100e6;
    const scene whole{
        .centre_hz = resonance_hz,
        .samples = 48000,
        .carriers = {{.offset_hz = 500.0, .level_dbfs = 0.0, .tones = {{.depth_percent = 80.0}}}},
        .path = {.resonator = scene_resonator{
                     .leak = 0.1,
                     .leak_phase_deg = 90.0,
                     .modes = {
                         {.frequency_hz = resonance_hz, .q_loaded = 50000.0, .phase_deg = 30.0}}}}};
    const auto response = [](double offset_hz) {
        return std::complex<double>{0.0, 0.1} +
               std::polar(1.0, M_PI / 6.0) / std::complex<double>{1.0, offset_hz / 1000.0};
    };
    const std::vector<cf64> made = render_samples(whole);
    for (const double hz : {-500.0, 500.0, 1500.0})
        EXPECT_NEAR(std::abs(line(made, 48000.0, hz) - (hz == 500.0 ? 1.0 : 0.4) * response(hz)),
                    0.0, 1e-12)
            << hz;
    // The envelope's tone: both sidebands turned to the carrier's phase.
    const std::complex<double> towards = std::conj(response(500.0)) / std::abs(response(500.0));
    const double tone =
        std::abs(0.4 * response(1500.0) * towards + std::conj(0.4 * response(-500.0) * towards));
    EXPECT_NEAR(truth_at(whole, 0, 0.0).tone_amplitudes[0], tone, 1e-12);
}

TEST(Resonator, FollowsACarrierThatDrifts) {
    constexpr double resonance_hz = 100e6;
    const scene whole{
        .centre_hz = resonance_hz,
        .carriers = {{.offset_hz = -5000.0, .level_dbfs = 0.0, .drift_hz_s = 10000.0}},
        .path = {.resonator = scene_resonator{
                     .modes = {{.frequency_hz = resonance_hz, .q_loaded = 50000.0}}}}};
    const std::vector<cf64> made = render_samples(whole);
    EXPECT_NEAR(std::abs(made[24000]), 1.0, 1e-12);
    EXPECT_NEAR(db(std::abs(made[28800])), -3.0103, 1e-4); // 1 kHz up
}

} // namespace
