// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/meter/audio_quality.hpp"

#include <gtest/gtest.h>

#include "detect/signals.hpp"
#include "tonewalk/detect/audio_path.hpp"

namespace tonewalk {
namespace {

using namespace test;

constexpr double rate_hz = 48000.0;

audio_quality quality_of(std::span<const float> audio, double tone_hz = not_measured,
                         double high_hz = 10000.0, std::uint64_t seed = 0) {
    audio_quality_meter meter{{.audio_rate_hz = rate_hz,
                               .audio_samples = std::ssize(audio),
                               .high_hz = high_hz,
                               .tone_hz = tone_hz}};
    if (seed == 0) {
        meter.add(audio);
    } else {
        in_pieces(audio, seed, [&](std::span<const float> piece) { meter.add(piece); });
    }
    return meter.result();
}

std::vector<float> sum(std::vector<float> a, std::span<const float> b) {
    for (std::size_t n = 0; n < a.size(); ++n) {
        a[n] += b[n];
    }
    return a;
}

std::vector<float> noise(std::size_t count, double rms, std::uint64_t seed) {
    random_stream random{seed};
    std::vector<float> samples;
    for (std::size_t n = 0; n < count; ++n) {
        samples.push_back(static_cast<float>(rms * random.gaussian()));
    }
    return samples;
}

TEST(AudioQuality, FindsAToneOfAnyFrequencyAndItsLevel) {
    for (const double hz : {63.7, 400.0, 1000.0, 1020.35, 7777.7}) {
        const audio_quality q = quality_of(real_tone(240000, rate_hz, hz, 0.25));
        EXPECT_NEAR(q.frequency_hz, hz, 1e-4) << hz;
        EXPECT_NEAR(q.level_dbfs, db(0.25), 0.001) << hz;
        EXPECT_GT(q.snr_db, 85.0) << hz; // the window's side lobes
    }
}

// DSP-12: 1 % is -40 dB, 3 % is -30.46 dB (computed). Two harmonics of 3 and 4 % are 5 % together.
TEST(AudioQuality, AddsHarmonicsInPower) {
    auto audio = real_tone(240000, rate_hz, 1000.3, 0.5);
    audio = sum(audio, real_tone(audio.size(), rate_hz, 2000.6, 0.5 * 0.03));
    audio = sum(audio, real_tone(audio.size(), rate_hz, 3000.9, 0.5 * 0.04));
    audio =
        sum(audio, real_tone(audio.size(), rate_hz, 11003.3, 0.5 * 0.2)); // beyond band and order
    EXPECT_NEAR(quality_of(audio).thd_percent, 5.0, 0.001);
    EXPECT_TRUE(std::isnan(quality_of(audio, not_measured, 1900.0).thd_percent));
    EXPECT_NEAR(quality_of(audio, not_measured, 2500.0).thd_percent, 3.0, 0.001);
}

TEST(AudioQuality, TellsToneFromNoiseInTheBand) {
    // 20 dB: a sine of 0.1 is 0.005 in power; white noise of 0.005/100 x 24000/9950 in all.
    const double rms = std::sqrt(0.005 / 100.0 * 24000.0 / 9950.0);
    const auto audio = sum(real_tone(960000, rate_hz, 1000.0, 0.1), noise(960000, rms, 3));
    const audio_quality q = quality_of(audio);
    EXPECT_NEAR(q.snr_db, 20.0, 0.1);
    EXPECT_NEAR(q.level_dbfs, -20.0, 0.02);
    EXPECT_NEAR(q.frequency_hz, 1000.0, 0.01);
    EXPECT_TRUE(std::isnan(q.thd_percent)); // lost in noise, not told to be none
}

TEST(AudioQuality, FindsNoToneInNoiseOrSilence) {
    EXPECT_TRUE(std::isnan(quality_of(noise(240000, 0.1, 5)).frequency_hz));
    EXPECT_TRUE(std::isnan(quality_of(noise(30000, 0.1, 6)).level_dbfs));
    EXPECT_TRUE(std::isnan(quality_of(std::vector<float>(240000)).snr_db));
    EXPECT_TRUE(std::isnan(quality_of({}).thd_percent));
}

TEST(AudioQuality, TakesTheToneItIsTold) {
    const auto audio =
        sum(real_tone(240000, rate_hz, 1000.0, 0.05), real_tone(240000, rate_hz, 3300.0, 0.5));
    EXPECT_NEAR(quality_of(audio).frequency_hz, 3300.0, 1e-3);
    EXPECT_NEAR(quality_of(audio, 1004.0).frequency_hz, 1000.0, 1e-3);
}

TEST(AudioQuality, SkipsGaps) {
    auto audio = real_tone(480000, rate_hz, 1000.0, 0.5);
    std::fill(audio.begin() + 100000, audio.begin() + 220017, 0.0F);
    std::fill(audio.begin() + 300000, audio.begin() + 300040, 0.0F);
    const audio_quality q = quality_of(audio);
    EXPECT_NEAR(q.level_dbfs, db(0.5), 0.001);
    EXPECT_LT(q.thd_percent, 0.0005);
    EXPECT_GT(q.snr_db, 85.0);
}

TEST(AudioQuality, KeepsAFadingTonesPower) {
    // A standing wave passed at 1.5 nodes a second: |cos|, rms 1/sqrt 2; its lines from 12 Hz on
    // are 42 dB down and less. The first and last quarter second weigh less than the rest: 0.05 dB
    // in 20 s.
    auto audio = real_tone(960000, rate_hz, 1000.0, 0.5);
    for (std::size_t m = 0; m < audio.size(); ++m) {
        audio[m] *=
            static_cast<float>(std::abs(std::cos(turn * 0.75 * static_cast<double>(m) / rate_hz)));
    }
    const audio_quality q = quality_of(audio);
    EXPECT_NEAR(q.frequency_hz, 1000.0, 0.01);
    EXPECT_NEAR(q.level_dbfs, db(0.5 / std::sqrt(2.0)), 0.06);
    EXPECT_LT(q.thd_percent, 0.02);
}

TEST(AudioQuality, ReadsAThirdOfASecond) {
    const audio_quality q = quality_of(real_tone(16000, rate_hz, 1000.0, 0.5));
    EXPECT_NEAR(q.frequency_hz, 1000.0, 0.05);
    EXPECT_NEAR(q.level_dbfs, db(0.5), 0.001);
    EXPECT_LT(q.thd_percent, 0.001);
}

TEST(AudioQuality, GivesTheSameBitsHoweverTheAudioIsCut) {
    const auto audio = sum(real_tone(200000, rate_hz, 1000.0, 0.5), noise(200000, 0.01, 9));
    const audio_quality whole = quality_of(audio);
    const audio_quality cut = quality_of(audio, not_measured, 10000.0, 4);
    EXPECT_EQ(cut.frequency_hz, whole.frequency_hz);
    EXPECT_EQ(cut.level_dbfs, whole.level_dbfs);
    EXPECT_EQ(cut.snr_db, whole.snr_db);
    EXPECT_EQ(cut.thd_percent, whole.thd_percent);
}

TEST(AudioQuality, UsesTheNamesOfTheContract) {
    const sheet s = describe(audio_quality{.frequency_hz = 1000.0});
    for (const auto* key : {"frequency_hz", "level_dbfs", "snr_db", "thd_percent"}) {
        EXPECT_NE(s.find(key), nullptr) << key;
    }
}

TEST(HeardAudio, AddsNoDistortionOfItsOwn) {
    for (const auto kind : {detector_kind::envelope, detector_kind::synchronous}) {
        for (const double in_hz : {80000.0, 81920.7, 48000.0}) {
            const auto samples =
                baseband(static_cast<std::size_t>(5.0 * in_hz), in_hz, [](double t) {
                    return std::polar(0.5, 0.3) * (1.0 + 0.42857 * std::cos(turn * 1000.0 * t));
                });
            kept_audio kept;
            audio_path path{{.rate_hz = in_hz,
                             .width_hz = 20000.0,
                             .detector = kind,
                             .band = choose_audio_band({.rate_hz = in_hz, .width_hz = 20000.0})},
                            kept};
            play(path, {}, samples);
            const audio_quality q = quality_of(kept.audio);
            EXPECT_LT(q.thd_percent, 0.0005) << in_hz;
            EXPECT_NEAR(q.level_dbfs, db(0.5 * 0.42857), 0.001) << in_hz;
            EXPECT_NEAR(q.frequency_hz, 1000.0, 1e-4) << in_hz;
        }
    }
}

} // namespace
} // namespace tonewalk
