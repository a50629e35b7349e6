// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/meter/tone_reading.hpp"

#include <gtest/gtest.h>

#include "detect/signals.hpp"

namespace tonewalk {
namespace {

using namespace test;

constexpr double rate_hz = 80000.0;

tone_reading::config reading_of(double tone_hz, detector_kind kind = detector_kind::envelope) {
    return {.detector = kind,
            .width_hz = 20000.0,
            .grid = {.rate_hz = rate_hz, .every_s = 0.1, .window_s = 0.2, .settle_samples = 60},
            .tone_hz = tone_hz};
}

std::vector<cf32> modulated(std::size_t count, double tone_hz, double depth) {
    return baseband(count, rate_hz, [&](double t) {
        return std::polar(0.1, 1.0) * (1.0 + depth * std::cos(turn * tone_hz * t + 0.4));
    });
}

TEST(ToneReading, GivesTheToneLevelOfEveryRecord) {
    for (const auto kind : {detector_kind::envelope, detector_kind::synchronous}) {
        for (const double tone_hz : {20.0, 50.0, 1000.0, 9000.0}) {
            tone_reading meter{reading_of(tone_hz, kind)};
            play(meter, {}, modulated(160000, tone_hz, 0.3), 3);
            const std::vector<double> levels = meter.tone_dbfs(tone_hz);
            ASSERT_EQ(levels.size(), 19U);
            for (const double level : levels) {
                // At 20 Hz the synchronous detector's average takes part of the tone for the
                // carrier.
                EXPECT_NEAR(level, db(0.03), tone_hz < 50.0 ? 0.01 : 0.001) << tone_hz;
            }
        }
    }
}

TEST(ToneReading, TellsItsColumn) {
    EXPECT_EQ(tone_reading{reading_of(1000.0)}.column_key(), "envelope_tone_dbfs");
    EXPECT_EQ(tone_reading{reading_of(1000.0, detector_kind::synchronous)}.column_key(),
              "synchronous_tone_dbfs");
}

TEST(ToneReading, UndoesTheDroopOfAToneBesideItsBin) {
    tone_reading meter{reading_of(1000.0)};
    play(meter, {}, modulated(80000, 1001.5, 0.3));
    for (const double level : meter.tone_dbfs(1001.5)) {
        EXPECT_NEAR(level, db(0.03), 0.001);
    }
    EXPECT_LT(meter.tone_dbfs(1000.0).front(), db(0.03) - 0.1);
}

TEST(ToneReading, TakesTheChannelsResponseOff) {
    tone_reading::config config = reading_of(1000.0);
    config.response = 0.5;
    tone_reading meter{config};
    play(meter, {}, modulated(80000, 1000.0, 0.15));
    EXPECT_NEAR(meter.tone_dbfs(1000.0).front(), db(0.03), 0.001);
}

TEST(ToneReading, FollowsTheGridThroughStretchesAndMissingSamples) {
    tone_reading meter{reading_of(1000.0)};
    const auto samples = modulated(80000, 1000.0, 0.3);
    // Records of 16000 from 0, 8000 ... 64000: sample 24000 lies in numbers 2 and 3, 47999 in 4 and
    // 5, 48000 in 5 and 6.
    const std::vector<sample_range> missing{{24000, 1}, {47999, 2}};
    play(meter, {}, samples, 9, missing);
    play(meter, {.index = 1, .start_s = 2.0, .held = false}, std::vector<cf32>(20000), 2);
    play(meter, {.index = 2, .start_s = 3.0}, std::span{samples}.first(15999));
    play(meter, {.index = 3, .start_s = 4.0}, std::span{samples}.first(16000));
    const std::vector<double> levels = meter.tone_dbfs(1000.0);
    ASSERT_EQ(levels.size(), 9U + 1U + 0U + 1U);
    const std::vector<bool> there{true,  true, false, false, false, false,
                                  false, true, true,  false, true};
    for (std::size_t n = 0; n < levels.size(); ++n) {
        EXPECT_EQ(std::isfinite(levels[n]), there[n]) << n;
    }
}

TEST(ToneReading, GivesTheSameBitsHoweverTheInputIsCut) {
    auto samples = modulated(100000, 1000.0, 0.3);
    add_noise(samples, 1e-3, 12);
    const auto run = [&](std::uint64_t seed) {
        tone_reading meter{reading_of(1000.0, detector_kind::synchronous)};
        play(meter, {}, samples, seed);
        return meter.tone_dbfs(1000.0);
    };
    const std::vector<double> whole = run(0);
    EXPECT_EQ(run(1), whole);
    EXPECT_EQ(run(2), whole);
}

} // namespace
} // namespace tonewalk
