// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/detect/audio_path.hpp"

#include <gtest/gtest.h>

#include "detect/signals.hpp"
#include "support/expect_error.hpp"

namespace tonewalk {
namespace {

using namespace test;

constexpr double width_hz = 20000.0;
constexpr double tone_hz = 1000.0, carrier = 0.5, depth = 0.42857;

audio_path::config path_at(double rate_hz, detector_kind kind = detector_kind::envelope) {
    return {.rate_hz = rate_hz,
            .width_hz = width_hz,
            .detector = kind,
            .band = choose_audio_band({.rate_hz = rate_hz, .width_hz = width_hz})};
}

/// A carrier with a tone; time counts from `start_s`.
std::vector<cf32> modulated(std::size_t count, double rate_hz, double start_s = 0.0) {
    return baseband(count, rate_hz, [&](double t) {
        return std::polar(carrier, 0.7) * (1.0 + depth * std::cos(turn * tone_hz * (t + start_s)));
    });
}

double truth(std::size_t m) {
    return carrier * depth * std::cos(turn * tone_hz * static_cast<double>(m) / 48000.0);
}

std::size_t zeros(std::span<const float> audio) {
    return static_cast<std::size_t>(std::count(audio.begin(), audio.end(), 0.0F));
}

float peak(std::span<const float> audio) {
    float highest = 0.0F;
    for (const float sample : audio) {
        highest = std::max(highest, std::abs(sample));
    }
    return highest;
}

TEST(AudioPath, PutsTheToneWhereItWasSentAtAnyRate) {
    for (const auto kind : {detector_kind::envelope, detector_kind::synchronous}) {
        for (const double rate_hz : {80000.0, 81920.7, 2.4e6 / 29.0, 48000.0, 24000.0}) {
            kept_audio kept;
            audio_path path{path_at(rate_hz, kind), kept};
            play(path, {}, modulated(static_cast<std::size_t>(2.0 * rate_hz), rate_hz));
            ASSERT_NEAR(static_cast<double>(kept.audio.size()), 96000.0, 1.0);
            EXPECT_EQ(path.audio_samples(), std::ssize(kept.audio));
            for (std::size_t m = 1000; m < 95000; m += 3) {
                // The filters see a mirror beyond both ends, in which the tone has another phase.
                const bool inside = m > 10000 && m < 86000;
                ASSERT_NEAR(static_cast<double>(kept.audio[m]), truth(m), inside ? 2e-6 : 5e-4)
                    << rate_hz << ' ' << m;
            }
        }
    }
}

TEST(AudioPath, StartsAndEndsWithoutAClick) {
    kept_audio kept;
    audio_path::config config = path_at(80000.0);
    config.settle_samples = 60;
    audio_path path{config, kept};
    std::vector<cf32> in = modulated(80000, 80000.0);
    for (std::size_t n = 0; n < 60; ++n) { // as a channel filter leaves both ends
        const auto share = 0.5F + static_cast<float>(n) / 120.0F;
        in[n] *= share;
        in[in.size() - 1 - n] *= share;
    }
    play(path, {}, in);
    EXPECT_LT(static_cast<double>(peak(kept.audio)), 1.3 * carrier * depth); // a step's overshoot
    EXPECT_NEAR(static_cast<double>(kept.audio[200]), truth(200), 0.03 * carrier);
}

TEST(AudioPath, FillsGapsWithSilenceOfEqualLength) {
    kept_audio kept;
    audio_path path{path_at(80000.0), kept};
    play(path, {.index = 0, .start_s = 10.0}, modulated(80000, 80000.0, 10.0));
    play(path, {.index = 1, .start_s = 11.5}, modulated(80000, 80000.0, 11.5));
    play(path, {.index = 2, .start_s = 12.5, .held = false}, std::vector<cf32>(40000));
    play(path, {.index = 3, .start_s = 13.0}, modulated(8000, 80000.0, 13.0));
    const std::span<const float> audio{kept.audio};
    ASSERT_EQ(audio.size(), 148800U); // 3.1 s
    EXPECT_EQ(zeros(audio.subspan(48000, 24000)), 24000U);
    EXPECT_EQ(zeros(audio.subspan(120000, 24000)), 24000U);
    EXPECT_EQ(zeros(audio), 48000U);
    EXPECT_NEAR(static_cast<double>(audio[24001]), truth(24001), 1e-5);
    EXPECT_NEAR(static_cast<double>(audio[96001]), truth(96001), 1e-5);
}

TEST(AudioPath, KeepsItsPlaceWhereAStretchStartsBetweenAudioSamples) {
    kept_audio kept;
    audio_path path{path_at(80000.0), kept};
    const double start_s = 1.0 + 0.3 / 48000.0;
    play(path, {.start_s = 0.0}, modulated(8000, 80000.0));
    play(path, {.index = 1, .start_s = start_s}, modulated(80000, 80000.0, start_s));
    for (std::size_t m = 49000; m < 95000; m += 7) {
        ASSERT_NEAR(static_cast<double>(kept.audio[m]), truth(m), 1e-4) << m;
    }
    EXPECT_EQ(kept.audio[48000], 0.0F);
    EXPECT_NE(kept.audio[48001], 0.0F);
}

TEST(AudioPath, CountsFromTheStartItIsGiven) {
    kept_audio kept;
    audio_path::config config = path_at(80000.0);
    config.start_s = 2.0;
    audio_path path{config, kept};
    play(path, {.start_s = 2.5}, modulated(8000, 80000.0));
    EXPECT_EQ(kept.audio.size(), 24000U + 4800U);
    EXPECT_EQ(zeros(std::span{kept.audio}.first(24000)), 24000U);
}

TEST(AudioPath, SilencesMissingSamplesWithoutAClick) {
    kept_audio kept;
    audio_path path{path_at(80000.0), kept};
    std::vector<cf32> in = modulated(160000, 80000.0);
    const std::vector<sample_range> missing{{40000, 4000}, {100000, 1}};
    for (const sample_range& range : missing) {
        std::fill_n(in.begin() + range.first, range.count, cf32{});
    }
    play(path, {}, in, 7, missing);
    const std::span<const float> audio{kept.audio};
    EXPECT_EQ(zeros(audio.subspan(24000, 2400)), 2400U);
    EXPECT_EQ(audio[60000], 0.0F);
    EXPECT_EQ(zeros(audio), 2401U);
    EXPECT_LT(static_cast<double>(peak(audio)), 1.6 * carrier * depth);
    for (const std::size_t m : {23000U, 30000U, 59000U, 61000U}) {
        EXPECT_NEAR(static_cast<double>(audio[m]), truth(m), 0.01 * carrier) << m;
    }
}

TEST(AudioPath, IsSilentWhereNothingCanBeUsed) {
    kept_audio kept;
    audio_path path{path_at(80000.0), kept};
    const std::vector<sample_range> all{{0, 160000}};
    play(path, {}, std::vector<cf32>(160000), 5, all);
    EXPECT_EQ(kept.audio.size(), 96000U);
    EXPECT_EQ(zeros(kept.audio), 96000U);
    play(path, {.index = 1, .start_s = 2.0}, {}); // an empty stretch
    EXPECT_EQ(kept.audio.size(), 96000U);
}

TEST(AudioPath, IsFlatInItsBandAndTakesTheCarrierOff) {
    audio_path::config config = path_at(80000.0, detector_kind::synchronous);
    config.band = choose_audio_band(
        {.rate_hz = 80000.0, .width_hz = width_hz, .low_hz = 300.0, .high_hz = 3400.0});
    const auto level = [&](double hz) {
        kept_audio kept;
        audio_path path{config, kept};
        play(path, {}, baseband(160000, 80000.0, [&](double t) {
                 return cf64{0.5 * (1.0 + 0.8 * std::cos(turn * hz * t))};
             }));
        const auto middle = std::span{kept.audio}.subspan(24000, 48000);
        return db(windowed_amplitude(middle, 48000.0, hz) / 0.4);
    };
    for (const double hz : {300.0, 333.0, 1000.0, 3000.0, 3400.0}) {
        EXPECT_NEAR(level(hz), 0.0, 0.1) << hz;
        EXPECT_NEAR(level(hz), 0.0, 0.001) << hz; // in fact
    }
    for (const double hz : {50.0, 150.0, 4250.0, 9000.0, 20000.0}) {
        EXPECT_LT(level(hz), -95.0) << hz;
    }
    kept_audio kept;
    audio_path path{config, kept};
    play(path, {}, baseband(160000, 80000.0, [](double) { return cf64{0.5}; }));
    EXPECT_LT(db(static_cast<double>(peak(kept.audio)) / 0.5), -105.0);
}

TEST(AudioPath, GivesTheSameBitsHoweverTheInputIsCut) {
    std::vector<cf32> in = modulated(100000, 81920.7);
    add_noise(in, 1e-3, 8);
    const std::vector<sample_range> missing{{30000, 700}};
    const auto run = [&](std::uint64_t seed) {
        kept_audio kept;
        audio_path::config config = path_at(81920.7, detector_kind::synchronous);
        config.settle_samples = 50;
        audio_path path{config, kept};
        play(path, {}, in, seed, missing);
        play(path, {.index = 1, .start_s = 2.0}, in, seed);
        return kept.audio;
    };
    const std::vector<float> whole = run(0);
    EXPECT_EQ(run(1), whole);
    EXPECT_EQ(run(2), whole);
}

TEST(AudioBand, IsHalfTheWidthOrWhatTheRatesHold) {
    const audio_band usual = choose_audio_band({.rate_hz = 80000.0, .width_hz = 20000.0});
    EXPECT_EQ(usual.low_hz, 50.0);
    EXPECT_EQ(usual.high_hz, 10000.0);
    const audio_band slow =
        choose_audio_band({.rate_hz = 80000.0, .width_hz = 20000.0, .audio_rate_hz = 8000.0});
    EXPECT_DOUBLE_EQ(slow.high_hz, 3600.0);
    EXPECT_DOUBLE_EQ(slow.stop_hz, 4000.0);
}

TEST(AudioBand, RefusesWhatCannotBeHad) {
    const auto band = [](std::optional<double> low, std::optional<double> high, double rate) {
        return caught([&] {
            (void)choose_audio_band({.rate_hz = 80000.0,
                                     .width_hz = 20000.0,
                                     .audio_rate_hz = rate,
                                     .low_hz = low,
                                     .high_hz = high});
        });
    };
    EXPECT_FALSE(band(300.0, 3400.0, 8000.0).kind);
    EXPECT_EQ(band(300.0, 3700.0, 8000.0).kind, fault::bad_request);
    EXPECT_EQ(band(0.0, 3400.0, 48000.0).kind, fault::bad_request);
    EXPECT_EQ(band(300.0, 200.0, 48000.0).kind, fault::bad_request);
    EXPECT_TRUE(band(300.0, 200.0, 48000.0).says("--band 300:200"));
    EXPECT_TRUE(band({}, {}, 7999.0).says("--audio-rate"));
    EXPECT_TRUE(band({}, {}, 192001.0).says("--audio-rate"));
    EXPECT_TRUE(band({}, {}, not_measured).says("--audio-rate"));
}

TEST(AudioBand, IsJudgedAsFarAsCanBeBeforeTheRecordingIsKnown) {
    const auto judged = [](double low, double high) {
        return caught([&] { check_audio_band({.low_hz = low, .high_hz = high}); }).kind;
    };
    EXPECT_FALSE(judged(300.0, 21600.0));
    EXPECT_EQ(judged(300.0, 21601.0), fault::bad_request); // 0.45 of the audio rate of 48 kHz
    EXPECT_EQ(judged(3000.0, 300.0), fault::bad_request);
    const auto in_a_channel = caught([] {
        (void)choose_audio_band(
            {.rate_hz = 10000.0, .width_hz = 8000.0, .low_hz = 300.0, .high_hz = 5000.0});
    });
    EXPECT_EQ(in_a_channel.kind, fault::malformed); // it does not fit this recording
    EXPECT_TRUE(in_a_channel.says("--band 300:5k"));
}

} // namespace
} // namespace tonewalk
