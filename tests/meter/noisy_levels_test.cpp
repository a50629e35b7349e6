// SPDX-License-Identifier: GPL-3.0-or-later
#include <algorithm>
#include <cmath>
#include <numbers>

#include <gtest/gtest.h>

#include "support/am_source.hpp"
#include "tonewalk/base/allowed_errors.hpp"
#include "tonewalk/maths/quantile.hpp"

namespace tonewalk {
namespace {

using test::am_signal;
using test::measure;
using test::meter_options;

double decibels(double power) {
    return 10.0 * std::log10(power);
}

double carrier_amplitude(const am_signal& s) {
    return std::pow(10.0, s.carrier_dbfs / 20.0);
}

/// Noise density for a carrier-to-noise ratio in a 20 kHz channel.
double density_at(const am_signal& s, double carrier_to_noise_db) {
    return std::pow(10.0, (s.carrier_dbfs - carrier_to_noise_db) / 10.0) / 20e3;
}

TEST(NoisyTone, HoldsItsMeanAndNearlyTheBoundsScatterThreeDecibelsBelowTheNoise) {
    am_signal s;
    s.rate_hz = 12.07e3;
    s.tone_hz = 1013.7;
    s.offset_hz = 0.31;
    s.depth = 0.3;
    s.noise_density = density_at(s, -3.0);
    meter_options o;
    o.every_s = o.window_s = 0.2;
    const level_log log = measure(s, 200.1, o);
    ASSERT_GE(log.records.size(), 1000U);
    const double truth = std::pow(s.depth * carrier_amplitude(s), 2);
    double sum = 0.0, squares = 0.0;
    for (const level_record& r : log.records) {
        sum += r.tone.power;
        squares += r.tone.power * r.tone.power;
    }
    const auto n = static_cast<double>(log.records.size());
    const double mean = sum / n;
    EXPECT_NEAR(decibels(mean / truth), 0.0, allowed("tone_mean_db.cn_minus3"));
    const double scatter = std::sqrt(squares / n - mean * mean) / (2.0 * std::sqrt(truth));
    const double bound = std::sqrt(s.noise_density / o.window_s);
    EXPECT_LE(scatter / bound, allowed("tone_scatter_ratio.cn_minus3"));
    EXPECT_GT(scatter / bound, 1.0); // nothing beats the bound
}

// DSP-2: std f = rate/(2 pi) sqrt(6/(eta N (N^2 - 1))), eta the signal-to-noise ratio of a sample.
// The tone in the in-phase part is a real sine (DSP-4): amplitude m A, noise of half the power.
TEST(NoisyFrequency, IsWithinTwiceTheBound) {
    constexpr int seeds = 200;
    double carrier_squares = 0.0, tone_squares = 0.0, carrier_bound = 0.0, tone_bound = 0.0;
    for (int seed = 1; seed <= seeds; ++seed) {
        random_stream random{static_cast<std::uint64_t>(seed)};
        am_signal s;
        s.seed = static_cast<std::uint64_t>(seed);
        s.rate_hz = random.uniform(5.5e3, 6.5e3);
        s.offset_hz = random.uniform(-0.4, 0.4);
        s.tone_hz = random.uniform(300.0, 500.0);
        s.depth = random.uniform(0.2, 0.9);
        s.phase = random.uniform(0.0, 6.28);
        s.tone_phase = random.uniform(0.0, 6.28);
        s.noise_density = density_at(s, 60.0);
        meter_options o;
        o.every_s = o.window_s = 1.0;
        o.tone_hz = s.tone_hz + random.uniform(-0.1, 0.1);
        const level_log log = measure(s, 1.005, o);
        ASSERT_EQ(log.records.size(), 1U);
        carrier_squares += std::pow(log.carrier_offset_hz - s.offset_hz, 2);
        tone_squares += std::pow(log.tone_hz - s.tone_hz, 2);
        const double n = s.rate_hz, eta = std::pow(carrier_amplitude(s), 2) /
                                          (s.noise_density * s.rate_hz); // one second
        const double turn = s.rate_hz / (2.0 * std::numbers::pi);
        carrier_bound += turn * turn * 6.0 / (eta * n * (n * n - 1.0));
        tone_bound += turn * turn * 12.0 / (s.depth * s.depth * eta * n * (n * n - 1.0));
    }
    EXPECT_LE(std::sqrt(carrier_squares / carrier_bound), allowed("frequency_ratio.cn_60"));
    EXPECT_LE(std::sqrt(tone_squares / tone_bound), allowed("frequency_ratio.cn_60"));
    EXPECT_GT(std::sqrt(carrier_squares / carrier_bound), 0.9);
    EXPECT_GT(std::sqrt(tone_squares / tone_bound), 0.9);
}

// DSP-20 (Rician envelope, S. O. Rice 1944/45, computed): what a meter that leaves the noise in its
// line reads too much, mean envelope re A; ours is right in linear power at every ratio.
TEST(OutsideNoisyCarrier, IsUnbiasedWhereARicianEnvelopeIsNot) {
    struct row {
        double snr_db, mean_envelope_db;
    };
    for (const row& each : {row{-6.0, 5.949}, row{0.0, 2.157}, row{6.0, 0.550}, row{12.0, 0.137}}) {
        am_signal s;
        s.rate_hz = 4.01e3;
        s.tone_hz = 450.3;
        s.depth = 0.5;
        meter_options o;
        o.every_s = o.window_s = 0.1;
        o.with_tone = false;
        s.depth = 0.0;
        const double power = std::pow(carrier_amplitude(s), 2);
        s.noise_density = power / std::pow(10.0, each.snr_db / 10.0) * o.window_s / 1.5;
        const level_log log = measure(s, 600.0, o);
        double corrected = 0.0, envelope = 0.0;
        for (const level_record& r : log.records) {
            corrected += r.carrier.power;
            envelope += std::sqrt(r.carrier.power + r.noise_power);
        }
        const auto n = static_cast<double>(log.records.size());
        // Standard error of the mean power, four of them: N sqrt((1 + 2 SNR)/n).
        const double snr = std::pow(10.0, each.snr_db / 10.0);
        EXPECT_NEAR(corrected / n / power, 1.0, 4.0 * std::sqrt((1.0 + 2.0 * snr) / n) / snr);
        EXPECT_NEAR(2.0 * decibels(envelope / n / carrier_amplitude(s)), each.mean_envelope_db,
                    0.15)
            << each.snr_db;
    }
}

// DSP-10 (Rayleigh envelope): median -1.5917, mean -1.0491, mean of dB -2.5068, re rms.
TEST(OutsideNoisyCarrier, WithoutACarrierIsRayleighAndHardlyEverDetected) {
    am_signal s;
    s.carrier_dbfs = -250.0;
    s.rate_hz = 4.01e3;
    s.depth = 0.0;
    s.noise_density = 1e-9;
    meter_options o;
    o.every_s = o.window_s = 0.1;
    o.tone_hz = 432.1;
    const level_log log = measure(s, 1200.0, o);
    std::vector<double> envelope;
    double mean = 0.0, mean_db = 0.0, squares = 0.0, carriers = 0.0, tones = 0.0;
    for (const level_record& r : log.records) {
        const double power = r.carrier.power + r.noise_power;
        envelope.push_back(std::sqrt(power));
        mean += envelope.back();
        mean_db += decibels(power);
        squares += power;
        carriers += r.carrier.detected ? 1.0 : 0.0;
        tones += r.tone.detected ? 1.0 : 0.0;
    }
    const auto n = static_cast<double>(log.records.size());
    const double rms = std::sqrt(squares / n);
    EXPECT_NEAR(20.0 * std::log10(median(envelope) / rms), -1.5917, 0.15);
    EXPECT_NEAR(20.0 * std::log10(mean / n / rms), -1.0491, 0.1);
    EXPECT_NEAR(mean_db / n - 20.0 * std::log10(rms), -2.5068, 0.2);
    EXPECT_NEAR(decibels(rms * rms), decibels(s.noise_density * 1.5 / o.window_s), 0.15);
    // p = 1e-3 a record: 12 expected, and Poisson's 99.9 %
    EXPECT_LT(carriers, 25.0);
    EXPECT_LT(tones, 25.0);
    EXPECT_GT(carriers + tones, 4.0);
}

double mean_noise_density(const level_log& log) {
    double sum = 0.0;
    for (const level_record& r : log.records) {
        sum += r.noise_power / log.noise_bandwidth_hz();
    }
    return sum / static_cast<double>(log.records.size());
}

TEST(NoiseDensity, IsThatOfTheNoiseHoweverStrongTheLines) {
    for (const double carrier_dbfs : {-40.0, -20.0, -4.0}) {
        am_signal s;
        s.rate_hz = 12.07e3;
        s.offset_hz = 2.3; // between the lines of the transform
        s.carrier_dbfs = carrier_dbfs;
        s.depth = 0.55;
        s.noise_density = 1e-12; // 106 dB line SNR at the top
        const level_log log = measure(s, 10.0, {});
        EXPECT_NEAR(decibels(mean_noise_density(log) / s.noise_density), 0.0, 0.1) << carrier_dbfs;
    }
}

TEST(NoiseDensity, IsThatOfTheNoiseFromFewLinesToo) {
    for (const double window_s : {0.012, 0.03, 0.11}) {
        am_signal s;
        s.rate_hz = 9.07e3;
        s.tone_hz = 413.7;
        s.noise_density = 1e-9;
        meter_options o;
        o.every_s = window_s / 2.0;
        o.window_s = window_s;
        const level_log log = measure(s, 60.0, o);
        EXPECT_NEAR(decibels(mean_noise_density(log) / s.noise_density), 0.0, 0.15) << window_s;
    }
}

TEST(NoiseDensity, LeavesHumAndHarmonicsOut) {
    am_signal s;
    s.rate_hz = 12.07e3;
    s.tone_hz = 613.7;
    s.noise_density = 1e-10;
    s.field = [](double t) {
        const double hum = 2.0 * std::numbers::pi * 50.0 * t;
        const double tone = 2.0 * std::numbers::pi * 613.7 * t;
        return std::complex<double>{1.0 + 0.02 * std::cos(hum) + 0.01 * std::cos(3.0 * hum) +
                                    0.03 * std::cos(2.0 * tone) + 0.01 * std::cos(3.0 * tone)};
    };
    EXPECT_NEAR(decibels(mean_noise_density(measure(s, 20.0, {})) / s.noise_density), 0.0, 0.6);
}

// (1 + m cos) e^(j b sin) in closed form: the carrier line is J0(b), the tone's in-phase part
// m (J0(b) + J2(b)), across it 2 J1(b).
TEST(IncidentalPhase, DoesNotEnterTheTone) {
    am_signal s;
    s.incidental_phase = 0.1;
    const double j0 = std::cyl_bessel_j(0.0, 0.1), j2 = std::cyl_bessel_j(2.0, 0.1);
    const double carrier_dbfs = s.carrier_dbfs + 20.0 * std::log10(j0);
    const double tone_dbfs = s.carrier_dbfs + 20.0 * std::log10(s.depth * (j0 + j2));
    for (const level_record& r : measure(s, 4.0, {}).records) {
        EXPECT_NEAR(r.carrier_dbfs.value, carrier_dbfs, allowed("level_db.clean"));
        EXPECT_NEAR(r.tone_dbfs.value, tone_dbfs, allowed("level_db.clean"));
    }
}

TEST(IncidentalPhase, IsTakenOffWhereTheCarrierIsTooWeakToTellItApart) {
    am_signal s;
    s.rate_hz = 6.03e3;
    s.tone_hz = 513.7;
    s.incidental_phase = 0.1;
    s.depth = 0.3;
    constexpr double strong_s = 30.0, weak_db = -26.0;
    s.field = [](double t) { return t < strong_s ? 1.0 : std::pow(10.0, weak_db / 20.0); };
    meter_options o;
    o.every_s = o.window_s = 0.2;
    // 40 dB line SNR, later 14
    s.noise_density = std::pow(carrier_amplitude(s), 2) * 1e-4 * o.window_s / 1.5;
    const level_log log = measure(s, 630.0, o);
    double sum = 0.0, n = 0.0, held = 0.0;
    const double j0 = std::cyl_bessel_j(0.0, 0.1), j2 = std::cyl_bessel_j(2.0, 0.1);
    const double truth_dbfs = s.carrier_dbfs + weak_db + 20.0 * std::log10(s.depth * (j0 + j2));
    for (const level_record& r : log.records) {
        if (r.time_s > strong_s + 1.0) {
            sum += r.tone.power;
            n += 1.0;
            held += (std::isnan(r.tone_dbfs.low95) || r.tone_dbfs.low95 <= truth_dbfs) &&
                            r.tone_dbfs.high95 >= truth_dbfs
                        ? 1.0
                        : 0.0;
        }
    }
    // Left in, incidental phase would add 10 log(1 + (0.1/0.3)^2) = 0.46 dB.
    EXPECT_NEAR(decibels(sum / n) - truth_dbfs, 0.0, 0.2);
    EXPECT_GT(100.0 * held / n, allowed("coverage_percent.floor_low"));
}

} // namespace
} // namespace tonewalk
