// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/meter/background.hpp"

#include <cmath>
#include <numbers>

#include <gtest/gtest.h>

#include "support/am_source.hpp"
#include "support/expect_error.hpp"

namespace tonewalk {
namespace {

using test::am_signal;

am_signal transmitter(double carrier_dbfs) {
    am_signal s;
    s.rate_hz = 8e3;
    s.tone_hz = 503.3;
    s.depth = 0.5;
    s.carrier_dbfs = carrier_dbfs;
    s.noise_density = std::pow(10.0, -110.0 / 10.0);
    return s;
}

/// A steady foreign line where the carrier stands; its phase turns slowly, so that it meets the
/// carrier in every phase.
struct intruder {
    double dbfs = -60.0, turns_per_s = 0.03;
    [[nodiscard]] std::complex<double> at(double time_s) const {
        return std::polar(std::pow(10.0, dbfs / 20.0),
                          2.0 * std::numbers::pi * turns_per_s * time_s);
    }
};

std::vector<cf32> with(const intruder& line, const am_signal& s, double seconds) {
    std::vector<cf32> samples = test::generate(s, seconds);
    for (std::size_t n = 0; n < samples.size(); ++n) {
        const std::complex<double> z = line.at(static_cast<double>(n) / s.rate_hz);
        samples[n] += cf32{static_cast<float>(z.real()), static_cast<float>(z.imag())};
    }
    return samples;
}

level_log log_of(const am_signal& s, const std::vector<cf32>& samples,
                 const background_lines& background, bool hold = false) {
    line_meter::config c = test::meter_config(s, {});
    c.background = background;
    c.hold_frequency = hold;
    line_meter meter{c};
    test::feed(meter, samples, 4093);
    return meter.take_result();
}

background_lines seen_without_transmitter(const intruder& line) {
    am_signal off = transmitter(-300.0);
    off.seed = 77;
    return background_of(log_of(off, with(line, off, 20.0), {}, true), "off.sigmf-meta");
}

TEST(Background, IsReadWhereTheTransmitterWouldStand) {
    const background_lines b = seen_without_transmitter({.dbfs = -60.0});
    EXPECT_NEAR(10.0 * std::log10(b.carrier.power), -60.0, 0.02);
    EXPECT_GE(20.0 * std::log10(b.carrier.bound), -60.0);
    EXPECT_LT(20.0 * std::log10(b.carrier.bound), -59.9);
    EXPECT_EQ(b.tone.power, 0.0); // nothing stands at the tone's lines
    EXPECT_GT(b.tone.bound, 0.0);
}

TEST(Background, NoiseAloneIsNone) {
    const background_lines b = seen_without_transmitter({.dbfs = -300.0});
    const double line_noise = std::pow(10.0, -11.0) * 1.5 / 0.2;
    EXPECT_EQ(b.carrier.power, 0.0);
    EXPECT_LT(b.carrier.bound * b.carrier.bound, line_noise);
}

TEST(Background, IsTakenOffInPowerOnAverage) {
    const intruder line{.dbfs = -46.0};
    const am_signal s = transmitter(-40.0);
    const std::vector<cf32> samples = with(line, s, 66.7); // two whole turns of the intruder
    const auto mean_dbfs = [&](const background_lines& b) {
        double sum = 0.0;
        const level_log log = log_of(s, samples, b);
        for (const level_record& r : log.records) {
            sum += r.carrier.power / static_cast<double>(log.records.size());
        }
        return 10.0 * std::log10(sum);
    };
    EXPECT_NEAR(mean_dbfs({}), -40.0 + 10.0 * std::log10(1.0 + std::pow(10.0, -0.6)), 0.05);
    EXPECT_NEAR(mean_dbfs(seen_without_transmitter(line)), -40.0, 0.05);
}

/// The intruder on the tone's upper line instead; two whole turns of it.
double mean_tone_dbfs(double carrier_dbfs, double intruder_dbfs, bool corrected) {
    const intruder line{.dbfs = intruder_dbfs, .turns_per_s = 503.3 + 0.03};
    am_signal s = transmitter(carrier_dbfs);
    const background_lines b = corrected ? seen_without_transmitter(line) : background_lines{};
    double sum = 0.0;
    const level_log log = log_of(s, with(line, s, 66.7), b);
    for (const level_record& r : log.records) {
        sum += r.tone.power / static_cast<double>(log.records.size());
    }
    return 10.0 * std::log10(sum);
}

TEST(Background, OfTheToneIsTakenOffOnAverageWhereTheCarrierIsStrong) {
    const double truth_dbfs = -40.0 + 20.0 * std::log10(0.5);
    EXPECT_NEAR(mean_tone_dbfs(-40.0, -58.0, false),
                10.0 * std::log10(std::pow(10.0, truth_dbfs / 10.0) + std::pow(10.0, -5.8)), 0.05);
    EXPECT_NEAR(mean_tone_dbfs(-40.0, -58.0, true), truth_dbfs, 0.05);
}

TEST(Background, OfTheToneIsTakenOffOnAverageWhereTheCarrierIsWeak) {
    const double truth_dbfs = -85.0 + 20.0 * std::log10(0.5); // carrier 10 dB over a line's noise
    EXPECT_NEAR(mean_tone_dbfs(-85.0, -93.0, true), truth_dbfs, 0.5);
    EXPECT_GT(mean_tone_dbfs(-85.0, -93.0, false), truth_dbfs + 1.5);
}

TEST(Background, EveryRecordsIntervalHoldsTheTruth) {
    const intruder line{.dbfs = -52.0};
    const am_signal s = transmitter(-40.0);
    const level_log log = log_of(s, with(line, s, 33.4), seen_without_transmitter(line));
    for (const level_record& r : log.records) {
        EXPECT_LE(r.carrier_dbfs.low95, -40.0);
        EXPECT_GE(r.carrier_dbfs.high95, -40.0);
        EXPECT_LT(r.carrier_dbfs.high95 - r.carrier_dbfs.low95, 9.0);
    }
}

TEST(Background, HidesWhatDoesNotRiseOverIt) {
    const intruder line{.dbfs = -52.0, .turns_per_s = 0.0};
    am_signal s = transmitter(-60.0);
    s.phase = 0.5 * std::numbers::pi; // across the intruder: 2.0 % more power than it alone
    level_log log = log_of(s, with(line, s, 10.0), seen_without_transmitter(line));
    for (const level_record& r : log.records) {
        EXPECT_FALSE(r.carrier.detected);
        EXPECT_TRUE(std::isnan(r.carrier_dbfs.value));
        EXPECT_TRUE(std::isnan(r.carrier_dbfs.low95));
        EXPECT_GE(r.carrier_dbfs.high95, -60.0);
        EXPECT_EQ(flag_words(r.flags), "background-limited");
    }
    add_background_note(log, quantity::tone); // the tone stands clear
    EXPECT_FALSE(log.doubts.has(note_code::background_limited));
    add_background_note(log, quantity::carrier);
    EXPECT_TRUE(log.doubts.has(note_code::background_limited));
}

TEST(Background, JustAboveItIsALevel) {
    const intruder line{.dbfs = -52.0, .turns_per_s = 0.0};
    am_signal s = transmitter(-51.0);
    s.phase = 0.5 * std::numbers::pi;
    level_log log = log_of(s, with(line, s, 10.0), seen_without_transmitter(line));
    for (const level_record& r : log.records) {
        EXPECT_NEAR(r.carrier_dbfs.value, -51.0, 0.1);
    }
    add_background_note(log, quantity::carrier);
    EXPECT_FALSE(log.doubts.has(note_code::background_limited));
}

TEST(Background, WantsARecordThatCouldBeMeasured) {
    level_log none;
    none.records.resize(3);
    const auto refusal = test::caught([&] { (void)background_of(none, "off.sigmf-meta"); });
    EXPECT_EQ(refusal.kind, fault::malformed);
    EXPECT_TRUE(refusal.says("off.sigmf-meta"));
}

} // namespace
} // namespace tonewalk
