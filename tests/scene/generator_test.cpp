// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/scene/generator.hpp"

#include <algorithm>
#include <cmath>
#include <cstdint>
#include <vector>

#include <gtest/gtest.h>

#include "projection.hpp"

namespace {

using namespace tonewalk;
using test::db;
using test::line;

/// Everything at once.
scene busy_scene() {
    return {.format = {.type = sample_type::i16},
            .rate_hz = 250000.0,
            .centre_hz = 433.92e6,
            .samples = 20011,
            .seed = 7,
            .carriers = {{.offset_hz = 31234.5,
                          .level_dbfs = -9.0,
                          .drift_hz_s = 40.0,
                          .wobble_hz = 3.0,
                          .wobble_period_s = 0.05,
                          .phase_noise_dbc_hz = -70.0,
                          .speech_percent = 20.0,
                          .tones = {{.depth_percent = 40.0,
                                     .incidental_rad = 0.02,
                                     .harmonics = {{.order = 3, .percent = 5.0}}}},
                          .hum = {{.depth_percent = 1.0}},
                          .waves = {{.amplitude = 0.7},
                                    {.amplitude = 0.2, .direction_deg = 160.0, .delay_s = 3.3e-5}},
                          .fades = {{0.0, 0.0}, {0.05, -6.0}},
                          .polarization =
                              scene_polarization{.axial_ratio_db = 6.0, .isolation_db = 30.0},
                          .pattern = scene_pattern{.kind = scene_pattern::shape::cardioid}},
                         {.offset_hz = -50000.0,
                          .level_dbfs = -30.0,
                          .start_s = 0.02,
                          .overmodulation = overmodulation::pinch_off,
                          .tones = {{.frequency_hz = 400.0, .depth_percent = 120.0}}}},
            .path = {.speed_m_s = 1.3, .rotation_deg_s = 90.0},
            .receiver = {.noise_dbfs_hz = -110.0,
                         .gain_steps = {{0.03, -3.0}},
                         .gain_control = scene_gain_control{},
                         .compression_dbfs = 3.0,
                         .iq_gain_error_db = 0.3,
                         .iq_phase_error_deg = 1.0,
                         .dc_dbfs = -40.0,
                         .spurs = {{.offset_hz = 1000.0}},
                         .clip_dbfs = -1.0,
                         .noise_lsb_rms = 0.5,
                         .gaps = {{.start_s = 0.01, .samples = 777}}}};
}

std::uint64_t hash_of(const std::vector<std::byte>& bytes) {
    std::uint64_t hash = 14695981039346656037U; // FNV-1a
    for (const std::byte each : bytes)
        hash = (hash ^ static_cast<std::uint64_t>(each)) * 1099511628211U;
    return hash;
}

// Pinned so that every machine, compiler and instruction set can be held to the same bytes.
TEST(GoldenScene, BytesAreTheSameOnEveryMachine) {
    EXPECT_EQ(hash_of(render_bytes(busy_scene())), 14568392869511733056U);
}

TEST(SceneGenerator, BytesDoNotDependOnHowTheOutputIsCut) {
    const std::vector<std::byte> whole = render_bytes(busy_scene());
    for (const std::size_t cut : {1U, 7U, 1000U, 1024U, 4097U, 1000000U}) {
        scene_generator generator{busy_scene()};
        std::vector<std::byte> pieces, piece(cut * 4U);
        while (const std::size_t made = generator.render_bytes(piece))
            pieces.insert(pieces.end(), piece.begin(),
                          piece.begin() + static_cast<std::ptrdiff_t>(made * 4U));
        EXPECT_EQ(pieces, whole) << "cut " << cut;
    }
}

TEST(SceneGenerator, SeedDecidesTheNoise) {
    scene other = busy_scene();
    EXPECT_EQ(render_bytes(other), render_bytes(busy_scene()));
    other.seed = 8;
    EXPECT_NE(render_bytes(other), render_bytes(busy_scene()));
}

TEST(SceneGenerator, LengthIsTheStatedOneEvenWhenPrime) {
    EXPECT_EQ(render_samples({.samples = 104729}).size(), 104729U);
    EXPECT_EQ(render_samples({.rate_hz = 44100.0, .duration_s = 0.1}).size(), 4410U);
}

// The sum of all spurious lines cannot exceed the error's rms.
TEST(Oscillator, StaysWithin150DecibelsOfTheTrueExponential) {
    constexpr double rate_hz = 2.4e6, offset_hz = 123456.789;
    const std::vector<cf64> made =
        render_samples({.rate_hz = rate_hz,
                        .samples = 1 << 20,
                        .carriers = {{.offset_hz = offset_hz, .level_dbfs = 0.0}}});
    long double square = 0.0L;
    for (std::size_t k = 0; k < made.size(); ++k) {
        const long double turns = static_cast<long double>(offset_hz) * k / rate_hz;
        square += std::norm(std::complex<long double>{made[k]} - test::turned(turns));
    }
    const double rms = static_cast<double>(std::sqrt(square / made.size()));
    EXPECT_LT(db(rms), -250.0);
}

TEST(Oscillator, HoldsItsPhaseAfterABillionSamples) {
    constexpr double rate_hz = 2.5e6, offset_hz = 312345.25;
    constexpr sample_index late = 1'000'000'000;
    const std::vector<cf64> made =
        render_samples({.rate_hz = rate_hz,
                        .segments = {{.samples = 1}, {.samples = 1, .lost_s = late / rate_hz}},
                        .carriers = {{.offset_hz = offset_hz, .level_dbfs = 0.0}}});
    const long double turns = static_cast<long double>(offset_hz) * (late + 1) / rate_hz;
    EXPECT_LT(std::abs(std::complex<long double>{made[1]} - test::turned(turns)), 1e-9L);
}

struct sideband_row {
    const char* id;
    double depth, power_db, sideband_dbc, peak_db, trough_db;
};
// AM-3 to AM-11: closed forms for one tone with full carrier (Haykin, Communication Systems, AM
// chapter, from memory; computed). Printed to three and four decimals.
constexpr sideband_row sideband_rows[] = {{"AM-3", 0.10, 0.0217, -26.021, 0.828, -0.915},
                                          {"AM-4", 0.20, 0.0860, -20.000, 1.584, -1.938},
                                          {"AM-5", 0.30, 0.1912, -16.478, 2.279, -3.098},
                                          {"AM-6", 0.40, 0.3342, -13.979, 2.923, -4.437},
                                          {"AM-7", 0.50, 0.5115, -12.041, 3.522, -6.021},
                                          {"AM-8", 0.80, 1.2057, -7.959, 5.105, -13.979},
                                          {"AM-9", 0.85, 1.3394, -7.432, 5.343, -16.478},
                                          {"AM-10", 0.90, 1.4768, -6.936, 5.575, -20.000}};

TEST(Modulation, SidebandsPowerAndPeaksOfOneToneAreThoseOfTheTextbook) {
    for (const sideband_row& row : sideband_rows) {
        const std::vector<cf64> made =
            render_samples({.rate_hz = 48000.0,
                            .samples = 48000,
                            .carriers = {{.offset_hz = 5000.0,
                                          .level_dbfs = -12.0,
                                          .tones = {{.depth_percent = 100.0 * row.depth}}}}});
        const double carrier = std::abs(line(made, 48000.0, 5000.0));
        EXPECT_NEAR(db(carrier), -12.0, 1e-9) << row.id;
        EXPECT_NEAR(db(std::abs(line(made, 48000.0, 6000.0)) / carrier), row.sideband_dbc, 5e-4);
        EXPECT_NEAR(db(std::abs(line(made, 48000.0, 4000.0)) / carrier), row.sideband_dbc, 5e-4);
        EXPECT_NEAR(db(std::sqrt(test::mean_power(made)) / carrier), row.power_db, 5e-5) << row.id;
        double highest = 0.0, lowest = 10.0;
        for (const cf64& z : made) {
            highest = std::max(highest, std::abs(z));
            lowest = std::min(lowest, std::abs(z));
        }
        EXPECT_NEAR(db(highest / carrier), row.peak_db, 5e-4) << row.id;
        EXPECT_NEAR(db(lowest / carrier), row.trough_db, 5e-4) << row.id;
    }
}

// AM-11: m = 1 reaches zero and twice the carrier.
TEST(Modulation, FullDepthReachesZero) {
    const std::vector<cf64> made = render_samples(
        {.samples = 48000, .carriers = {{.level_dbfs = 0.0, .tones = {{.depth_percent = 100.0}}}}});
    double highest = 0.0, lowest = 10.0;
    for (const cf64& z : made) {
        highest = std::max(highest, std::abs(z));
        lowest = std::min(lowest, std::abs(z));
    }
    EXPECT_NEAR(db(highest), 6.021, 5e-4);
    EXPECT_NEAR(lowest, 0.0, 1e-12);
    EXPECT_NEAR(10.0 * std::log10(test::mean_power(made)), 1.7609, 5e-5);
}

TEST(Modulation, ToneCarrierAndHarmonicPhasesAreThoseStated) {
    const std::vector<cf64> made = render_samples(
        {.samples = 48000,
         .carriers = {
             {.offset_hz = -3000.0,
              .level_dbfs = 0.0,
              .phase_deg = 70.0,
              .tones = {{.depth_percent = 50.0,
                         .phase_deg = 40.0,
                         .harmonics = {{.order = 2, .percent = 10.0, .phase_deg = 15.0}}}}}}});
    const std::complex<double> carrier = line(made, 48000.0, -3000.0);
    const double deg = 180.0 / M_PI;
    EXPECT_NEAR(std::arg(carrier) * deg, 70.0, 1e-9);
    EXPECT_NEAR(std::arg(line(made, 48000.0, -2000.0) / carrier) * deg, 40.0, 1e-9);
    EXPECT_NEAR(std::arg(line(made, 48000.0, -4000.0) / carrier) * deg, -40.0, 1e-9);
    EXPECT_NEAR(std::arg(line(made, 48000.0, -1000.0) / carrier) * deg, 95.0, 1e-9);
    EXPECT_NEAR(std::abs(line(made, 48000.0, -1000.0) / carrier), 0.025, 1e-12);
}

struct overmodulation_row {
    double depth, mean, fundamental, thd_percent;
};
void expect_overmodulated(overmodulation way, const overmodulation_row& row) {
    const std::vector<cf64> made = render_samples(
        {.samples = 48000,
         .carriers = {{.level_dbfs = 0.0,
                       .overmodulation = way,
                       .tones = {{.frequency_hz = 50.0, .depth_percent = 100.0 * row.depth}}}}});
    std::vector<cf64> envelope;
    for (const cf64& z : made)
        envelope.emplace_back(std::abs(z), 0.0);
    const double mean = line(envelope, 48000.0, 0.0).real();
    const double fundamental = 2.0 * std::abs(line(envelope, 48000.0, 50.0));
    double squares = 0.0;
    for (int order = 2; order < 200; ++order)
        squares += std::norm(2.0 * line(envelope, 48000.0, 50.0 * order));
    EXPECT_NEAR(mean, row.mean, 1.5e-5);
    EXPECT_NEAR(fundamental / mean, row.fundamental, 1.5e-5);
    EXPECT_NEAR(100.0 * std::sqrt(squares) / fundamental, row.thd_percent, 0.006);
}

// AM-25 and AM-26, computed from the closed forms; printed to five and two decimals.
TEST(Modulation, OvermodulationFoldsAsAnIdealMultiplierDoes) {
    expect_overmodulated(overmodulation::fold, {1.1, 1.01818, 1.04530, 5.85});
    expect_overmodulated(overmodulation::fold, {1.25, 1.06780, 1.04878, 14.93});
    expect_overmodulated(overmodulation::fold, {1.5, 1.17632, 0.99577, 28.38});
}

TEST(Modulation, OvermodulationPinchesOffAsARealTransmitterDoes) {
    expect_overmodulated(overmodulation::pinch_off, {1.1, 1.00909, 1.07240, 2.88});
    expect_overmodulated(overmodulation::pinch_off, {1.25, 1.03390, 1.14609, 7.06});
    expect_overmodulated(overmodulation::pinch_off, {1.5, 1.08816, 1.22746, 12.44});
}

TEST(Modulation, ToneAndCarrierSoundOnlyBetweenTheirTimes) {
    const std::vector<cf64> made = render_samples(
        {.samples = 48000,
         .carriers = {{.level_dbfs = 0.0,
                       .start_s = 0.1,
                       .stop_s = 0.9,
                       .tones = {{.depth_percent = 50.0, .start_s = 0.3, .stop_s = 0.5}}}}});
    const auto magnitude = [&](std::size_t k) { return std::abs(made[k]); };
    EXPECT_EQ(magnitude(4799), 0.0);
    EXPECT_NEAR(magnitude(4800), 1.0, 1e-15);
    EXPECT_NEAR(magnitude(14399), 1.0, 1e-15);
    EXPECT_NEAR(magnitude(14400), 1.5, 1e-12);
    EXPECT_NEAR(magnitude(23976), 0.5, 1e-12); // half a cycle before 0.5 s
    EXPECT_NEAR(magnitude(24000), 1.0, 1e-15);
    EXPECT_NEAR(magnitude(43199), 1.0, 1e-15);
    EXPECT_EQ(magnitude(43200), 0.0);
}

// sin and cos series of phase modulation: lines J0, J1 (Bessel).
TEST(Modulation, IncidentalPhaseMakesTheLinesOfPhaseModulation) {
    constexpr double deviation_rad = 0.3;
    const std::vector<cf64> made = render_samples(
        {.samples = 48000,
         .carriers = {{.level_dbfs = 0.0,
                       .tones = {{.depth_percent = 0.0, .incidental_rad = deviation_rad}}}}});
    EXPECT_NEAR(std::abs(line(made, 48000.0, 0.0)), std::cyl_bessel_j(0, deviation_rad), 1e-12);
    EXPECT_NEAR(std::abs(line(made, 48000.0, 1000.0)), std::cyl_bessel_j(1, deviation_rad), 1e-12);
    EXPECT_NEAR(std::abs(line(made, 48000.0, -2000.0)), std::cyl_bessel_j(2, deviation_rad), 1e-12);
}

TEST(Oscillator, DriftAndWobbleMoveTheFrequencyAsStated) {
    constexpr double rate_hz = 48000.0;
    const std::vector<cf64> made = render_samples({.rate_hz = rate_hz,
                                                   .samples = 96000,
                                                   .carriers = {{.offset_hz = 100.0,
                                                                 .level_dbfs = 0.0,
                                                                 .drift_hz_s = -25.0,
                                                                 .wobble_hz = 4.0,
                                                                 .wobble_period_s = 0.5}}});
    for (std::size_t k = 100; k < made.size(); k += 4999) {
        const double time_s = (static_cast<double>(k) + 0.5) / rate_hz;
        const double step = std::arg(made[k + 1] * std::conj(made[k]));
        const double truth_hz = 100.0 - 25.0 * time_s + 4.0 * std::sin(4.0 * M_PI * time_s);
        EXPECT_NEAR(step * rate_hz / (2.0 * M_PI), truth_hz, 1e-6) << time_s;
    }
}

// A walk of density D/(2 pi f)^2 grows by D t rad^2 (definition of white frequency noise).
TEST(Oscillator, PhaseNoiseHasTheStatedDensity) {
    constexpr double rate_hz = 48000.0, density_dbc_hz = -60.0;
    const std::vector<cf64> made =
        render_samples({.rate_hz = rate_hz,
                        .samples = 480000,
                        .carriers = {{.level_dbfs = 0.0, .phase_noise_dbc_hz = density_dbc_hz}}});
    const double growth = std::pow(2.0 * M_PI * 1000.0, 2) * std::pow(10.0, density_dbc_hz / 10.0);
    for (const std::size_t lag : {1U, 10U}) {
        double square = 0.0;
        std::size_t count = 0;
        for (std::size_t k = 0; k + lag < made.size(); k += lag, ++count)
            square += std::pow(std::arg(made[k + lag] * std::conj(made[k])), 2);
        const double variance = square / static_cast<double>(count);
        const double truth = growth * static_cast<double>(lag) / rate_hz;
        EXPECT_NEAR(variance / truth, 1.0, 5.0 * std::sqrt(2.0 / static_cast<double>(count)));
    }
}

TEST(SpeechLike, HasNoSteadyLineAndStaysInItsBandAndDepth) {
    constexpr double rate_hz = 16000.0;
    const std::vector<cf64> made =
        render_samples({.rate_hz = rate_hz,
                        .duration_s = 4.0,
                        .carriers = {{.level_dbfs = 0.0, .speech_percent = 60.0}}});
    std::vector<cf64> waveform;
    for (const cf64& z : made)
        waveform.push_back(z - 1.0);
    EXPECT_GT(test::mean_power(waveform), 1e-3);
    for (const cf64& z : waveform)
        ASSERT_LE(std::abs(z.real()), 0.6);
    for (std::size_t second = 0; second < 4; ++second) {
        const std::span<const cf64> part = std::span{waveform}.subspan(second * 16000, 16000);
        const double power = test::mean_power(part);
        for (double hz = 50.0; hz < 3400.0; hz += 4.0) {
            const double both_lines = 2.0 * std::norm(line(part, rate_hz, hz));
            ASSERT_LT(both_lines, 0.15 * power) << hz << " Hz, second " << second;
        }
        for (double hz = 4000.0; hz < 7900.0; hz += 50.0)
            ASSERT_LT(std::norm(line(part, rate_hz, hz)), 1e-6 * power) << hz;
    }
}

TEST(SceneGenerator, CarriersRunOnThroughAGap) {
    const scene whole{.samples = 3000, .carriers = {{.offset_hz = 777.0, .tones = {{}}}}};
    scene broken = whole;
    broken.samples = 2000;
    broken.receiver.gaps = {{.start_s = 0.01, .samples = 1000}}; // at sample 480
    const std::vector<cf64> all = render_samples(whole), rest = render_samples(broken);
    EXPECT_TRUE(std::equal(rest.begin(), rest.begin() + 480, all.begin()));
    EXPECT_TRUE(std::equal(rest.begin() + 480, rest.end(), all.begin() + 1480));
}

TEST(SceneGenerator, SegmentsSeeTheTransmitterFromTheirOwnCentre) {
    const scene whole{
        .rate_hz = 48000.0,
        .centre_hz = 145.2e6,
        .segments = {{.samples = 4800},
                     {.samples = 4800, .centre_hz = 145.203e6},
                     {.samples = 4800, .centre_hz = 145.3e6}},
        .carriers = {{.offset_hz = 5000.0, .level_dbfs = -6.0},
                     {.offset_hz = -8000.0, .follows_centre = true, .level_dbfs = -20.0}}};
    const std::vector<cf64> made = render_samples(whole);
    const auto level = [&](std::size_t segment, double hz) {
        return std::abs(line(std::span{made}.subspan(segment * 4800, 4800), 48000.0, hz));
    };
    EXPECT_NEAR(db(level(0, 5000.0)), -6.0, 1e-9);
    EXPECT_NEAR(db(level(1, 2000.0)), -6.0, 1e-9);
    EXPECT_LT(level(1, 5000.0), 1e-12);
    EXPECT_LT(level(2, 5000.0), 1e-12); // out of the band there
    for (const std::size_t segment : {0U, 1U, 2U})
        EXPECT_NEAR(db(level(segment, -8000.0)), -20.0, 1e-9);
}

} // namespace
