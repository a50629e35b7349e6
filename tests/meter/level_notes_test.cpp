// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/meter/level_notes.hpp"

#include <cmath>
#include <numbers>

#include <gtest/gtest.h>

#include "support/am_source.hpp"

namespace tonewalk {
namespace {

using test::am_signal;
using time_db = std::function<double(double)>;

double amplitude(double db) {
    return std::pow(10.0, db / 20.0);
}

level_log noted(const am_signal& s, const std::vector<cf32>& samples,
                const test::meter_options& o = {}) {
    line_meter meter{test::meter_config(s, o)};
    test::feed(meter, samples, o.cut);
    level_log log = meter.take_result();
    add_level_notes(log, quantity::tone);
    return log;
}

am_signal with_line_snr(double db) {
    am_signal s;
    s.rate_hz = 8e3;
    s.tone_hz = 503.3;
    s.depth = 0.6;
    s.noise_density = std::pow(10.0, (s.carrier_dbfs - db) / 10.0) * 0.2 / 1.5;
    return s;
}

/// `fade_db` is the field's, `gain_db` the receiver's: it moves the noise as
/// well.
level_log received(am_signal s, double seconds, const time_db& fade_db, const time_db& gain_db) {
    if (fade_db) {
        s.field = [&](double t) { return std::complex<double>{amplitude(fade_db(t)), 0.0}; };
    }
    std::vector<cf32> samples = test::generate(s, seconds);
    for (std::size_t n = 0; gain_db && n < samples.size(); ++n) {
        samples[n] *= static_cast<float>(amplitude(gain_db(static_cast<double>(n) / s.rate_hz)));
    }
    return noted(s, samples);
}

bool doubts_gain(const level_log& log) {
    return log.doubts.has(note_code::gain_step) || log.doubts.has(note_code::agc_suspected);
}

time_db step_at(double time_s, double db) {
    return [=](double t) { return t < time_s ? 0.0 : db; };
}

/// Slow fades of this depth in decibels, one each 10 s.
time_db fades(double depth_db) {
    return [=](double t) {
        return -depth_db * 0.5 * (1.0 - std::cos(2.0 * std::numbers::pi * t / 10.0));
    };
}

TEST(GainStep, OfHalfADecibelIsNotedWithItsSizeAndTime) {
    for (const double db : {0.5, -0.5, 3.0}) {
        const level_log log = received(with_line_snr(40.0), 20.0, {}, step_at(10.0, db));
        ASSERT_TRUE(log.doubts.has(note_code::gain_step)) << db;
        const std::string& text = log.doubts.all().front().text;
        EXPECT_NE(text.find(db > 0.0 ? "+" : "-"), text.npos) << text;
        EXPECT_NEAR(std::stod(text.substr(text.rfind(" at ") + 4)), 10.0, 0.2) << text;
    }
}

TEST(GainStep, OfThreeTenthsIsNot) {
    EXPECT_FALSE(doubts_gain(received(with_line_snr(40.0), 20.0, {}, step_at(10.0, 0.3))));
}

TEST(GainStep, IsNoneWhereTheFieldAloneSteps) {
    for (const double db : {0.5, -3.0, -20.0}) {
        EXPECT_FALSE(doubts_gain(received(with_line_snr(40.0), 20.0, step_at(10.0, db), {}))) << db;
    }
}

TEST(GainControl, OfADecibelOverAFadeOfTwentyIsNoted) {
    const time_db control = [](double t) { return -fades(1.0)(t); };
    const level_log log = received(with_line_snr(45.0), 40.0, fades(20.0), control);
    EXPECT_TRUE(log.doubts.has(note_code::agc_suspected));
    EXPECT_FALSE(log.doubts.has(note_code::gain_step));
}

TEST(GainControl, OfThreeTenthsIsNot) {
    const time_db control = [](double t) { return -fades(0.3)(t); };
    EXPECT_FALSE(doubts_gain(received(with_line_snr(45.0), 40.0, fades(20.0), control)));
}

TEST(CleanFades, RaiseNoDoubtOfTheReceiver) {
    for (const double line_snr_db : {25.0, 45.0, 75.0, 110.0}) {
        for (const double depth_db : {20.0, 60.0}) {
            for (const std::uint64_t seed : {1U, 2U, 3U}) {
                am_signal s = with_line_snr(line_snr_db);
                s.seed = seed;
                const level_log log = received(s, 40.0, fades(depth_db), {});
                EXPECT_FALSE(doubts_gain(log)) << line_snr_db << " dB, fade " << depth_db;
                EXPECT_FALSE(log.doubts.has(note_code::depth_varies))
                    << line_snr_db << " dB, fade " << depth_db;
            }
        }
    }
}

/// Two waves whose sum passes through sharp nulls, 30 dB below the peaks.
TEST(CleanFades, OfAStandingWaveRaiseNoneEither) {
    for (const double line_snr_db : {30.0, 50.0, 110.0}) {
        am_signal s = with_line_snr(line_snr_db);
        s.field = [](double t) {
            return 0.516 + 0.484 * std::polar(1.0, 2.0 * std::numbers::pi * t / 4.0);
        };
        const level_log log = noted(s, test::generate(s, 40.0));
        EXPECT_FALSE(doubts_gain(log)) << line_snr_db;
        EXPECT_FALSE(log.doubts.has(note_code::depth_varies)) << line_snr_db;
    }
}

/// The depth swings by `share` of itself, either way.
level_log with_varying_depth(double share) {
    am_signal s = with_line_snr(45.0);
    std::vector<cf32> samples(static_cast<std::size_t>(20.0 * s.rate_hz));
    random_stream random{9};
    const double noise = std::sqrt(s.noise_density * s.rate_hz / 2.0);
    for (std::size_t n = 0; n < samples.size(); ++n) {
        const double t = static_cast<double>(n) / s.rate_hz, two_pi = 2.0 * std::numbers::pi;
        const double m = s.depth * (1.0 + share * std::sin(two_pi * t / 7.0));
        const double a = amplitude(s.carrier_dbfs) * (1.0 + m * std::cos(two_pi * s.tone_hz * t));
        const double re = random.gaussian(), im = random.gaussian();
        samples[n] = cf32{cf64{a + noise * re, noise * im}};
    }
    return noted(s, samples);
}

// Line SNR 45 dB: a record tells the depth to 0.7 % (tone 32 dB over its noise
// 4N).
TEST(DepthVaries, BeyondWhatNoiseExplainsOnly) {
    EXPECT_TRUE(with_varying_depth(0.01).doubts.has(note_code::depth_varies));
    EXPECT_FALSE(with_varying_depth(0.001).doubts.has(note_code::depth_varies));
}

/// A log of 1000 records of which so many bear a flag.
level_log flagged(std::size_t records, std::uint32_t flags) {
    level_log log;
    log.tone_hz = 1000.0;
    log.records.resize(1000);
    for (std::size_t k = 0; k < records; ++k) {
        log.records[k].flags = flags;
    }
    return log;
}

struct codes {
    bool weak_carrier, weak_tone, limited, skipped, suppressed;
    friend bool operator==(const codes&, const codes&) = default;
};

codes raised(level_log log, quantity used) {
    add_level_notes(log, used);
    const note_set& d = log.doubts;
    return {d.has(note_code::weak_carrier), d.has(note_code::weak_tone),
            d.has(note_code::floor_limited), d.has(note_code::segments_skipped),
            d.has(note_code::envelope_suppressed)};
}

TEST(WeakLines, AreNotedBeyondOnePercentOfTheRecords) {
    const codes none{false, false, false, false, false};
    EXPECT_EQ(raised(flagged(0, 0), quantity::tone), none);
    EXPECT_EQ(raised(flagged(11, flag_weak_carrier), quantity::tone),
              (codes{true, false, false, false, false}));
    EXPECT_EQ(raised(flagged(10, flag_weak_carrier), quantity::tone), none);
    EXPECT_EQ(raised(flagged(11, flag_weak_tone), quantity::carrier),
              (codes{false, true, false, false, false}));
    EXPECT_EQ(raised(flagged(10, flag_weak_tone), quantity::carrier), none);
}

TEST(FloorLimited, IsNotedFromTheFirstRecordOfTheQuantityInUse) {
    EXPECT_TRUE(raised(flagged(1, flag_weak_carrier), quantity::carrier).limited);
    EXPECT_TRUE(raised(flagged(1, flag_weak_tone), quantity::tone).limited);
    EXPECT_FALSE(raised(flagged(1, flag_weak_tone), quantity::carrier).limited);
    EXPECT_FALSE(raised(flagged(1, flag_weak_carrier), quantity::tone).limited);
}

TEST(SegmentsSkipped, AreNotedFromTheFirstRecord) {
    EXPECT_TRUE(raised(flagged(1, flag_not_held), quantity::tone).skipped);
    EXPECT_FALSE(raised(flagged(1, flag_non_finite), quantity::tone).skipped);
    am_signal s = with_line_snr(40.0);
    const std::vector<cf32> samples = test::generate(s, 1.0);
    line_meter meter{test::meter_config(s, {})};
    meter.begin_stretch({.index = 0});
    meter.add({samples, 0, {}});
    meter.end_stretch();
    meter.begin_stretch({.index = 1, .start_s = 5.0, .held = false});
    meter.add({samples, 0, {}});
    meter.end_stretch();
    meter.finish();
    level_log log = meter.take_result();
    add_level_notes(log, quantity::tone);
    EXPECT_TRUE(log.doubts.has(note_code::segments_skipped));
    EXPECT_FALSE(log.doubts.has(note_code::floor_limited)); // null, not bounded
}

TEST(WeakLines, AreFlaggedRecordByRecord) {
    am_signal s = with_line_snr(40.0);
    s.field = [](double t) { return std::complex<double>{t < 5.0 ? 1.0 : 1e-4, 0.0}; };
    const level_log log = noted(s, test::generate(s, 10.0));
    EXPECT_TRUE(log.doubts.has(note_code::weak_carrier));
    EXPECT_TRUE(log.doubts.has(note_code::weak_tone));
    EXPECT_TRUE(log.doubts.has(note_code::floor_limited));
    for (const level_record& r : log.records) {
        if (r.time_s < 4.85) {
            EXPECT_EQ(r.flags, 0U) << r.time_s;
        }
    }
    EXPECT_EQ(log.records.back().flags, flag_weak_carrier | flag_weak_tone);
    EXPECT_TRUE(std::isnan(log.records.back().carrier_dbfs.value));
    EXPECT_FALSE(std::isnan(log.records.back().carrier_dbfs.high95));
}

} // namespace
} // namespace tonewalk
