// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/detect/audio_loudness.hpp"

#include <gtest/gtest.h>

#include "detect/signals.hpp"
#include "support/expect_error.hpp"
#include "support/temporary_folder.hpp"

namespace tonewalk {
namespace {

using namespace test;

struct rendering {
    audio_result result;
    std::vector<float> audio;
};

rendering render(std::span<const float> spooled, audio_options options,
                 const carrier_curve& carrier = {}) {
    const temporary_folder folder;
    audio_spool spool{folder.path()};
    spool.add(spooled);
    spool.close();
    if (options.audio_samples == 0) {
        options.audio_samples = spool.samples();
    }
    kept_audio first, second;
    const std::vector<audio_sink*> sinks{&first, &second};
    const audio_result result = render_audio(spool, options, carrier, sinks);
    EXPECT_EQ(first.audio, second.audio);
    return {result, first.audio};
}

double peak_of(std::span<const float> audio) {
    double highest = 0.0;
    for (const float sample : audio) {
        highest = std::max(highest, std::abs(static_cast<double>(sample)));
    }
    return highest;
}

TEST(FieldLoudness, PutsTheHighestSampleAtMinusOneDecibelFullScale) {
    const std::vector<float> quiet = real_tone(48000, 48000.0, 1000.0, 0.003);
    const carrier_curve carrier{std::vector{0.0}, std::vector{0.01}};
    const rendering r = render(quiet, {}, carrier);
    EXPECT_NEAR(db(peak_of(r.audio)), -1.0, 1e-5);
    EXPECT_NEAR(r.result.gain_db, -1.0 - db(0.003), 1e-5);
    // 0.003 is a depth of 30 % at that carrier and stands at 0.8913: 1.0 is 33.66 %.
    EXPECT_NEAR(r.result.full_scale_depth_percent, 30.0 / std::pow(10.0, -1.0 / 20.0), 1e-4);
    EXPECT_EQ(r.result.audio_rate_hz, 48000.0);
    EXPECT_EQ(r.result.audio_seconds, 1.0);
    EXPECT_EQ(r.result.clipped_audio_samples, 0);
}

TEST(FieldLoudness, TakesAPositiveGainAsAmplificationAndCountsWhatItClips) {
    const std::vector<float> audio{0.1F, -0.2F, 0.05F, -0.1F, 0.0999F};
    const rendering r = render(audio, {.gain_db = 20.0});
    EXPECT_NEAR(static_cast<double>(r.audio[2]), 0.5, 1e-6);
    EXPECT_EQ(r.audio[1], -1.0F);
    EXPECT_EQ(r.audio[0], 1.0F);
    EXPECT_EQ(r.result.clipped_audio_samples, 1);
    const rendering open = render(audio, {.gain_db = 20.0, .clamp = false});
    EXPECT_EQ(open.audio[1], -2.0F);
    EXPECT_EQ(open.result.clipped_audio_samples, 1);
    EXPECT_TRUE(std::isnan(r.result.full_scale_depth_percent)); // no carrier known
}

TEST(FieldLoudness, LeavesSilenceSilent) {
    const rendering r = render(std::vector<float>(100), {});
    EXPECT_EQ(r.result.gain_db, 0.0);
    EXPECT_EQ(peak_of(r.audio), 0.0);
}

TEST(SteadyLoudness, RemovesAFadeOfTwentyDecibel) {
    // The carrier falls by 20 dB within 2 s and comes back; depth 50 %, so the tone stands at 0.25.
    const auto level = [](double t) {
        return 0.1 * std::pow(10.0, -0.5 - 0.5 * std::sin(turn * t / 8.0));
    };
    std::vector<double> time_s, amplitude;
    for (double t = 0.1; t < 8.0; t += 0.1) {
        time_s.push_back(30.0 + t);
        amplitude.push_back(level(t));
    }
    std::vector<float> audio = real_tone(8 * 48000, 48000.0, 1000.0, 0.5);
    for (std::size_t m = 0; m < audio.size(); ++m) {
        audio[m] *= static_cast<float>(level(static_cast<double>(m) / 48000.0));
    }
    const rendering r = render(audio, {.mode = loudness::steady, .start_s = 30.0},
                               carrier_curve{time_s, amplitude});
    EXPECT_TRUE(std::isnan(r.result.gain_db));
    EXPECT_EQ(r.result.full_scale_depth_percent, 200.0);
    for (std::size_t m = 9600; m + 9600 < r.audio.size(); m += 4800) {
        const auto part = std::span{r.audio}.subspan(m, 4800);
        EXPECT_NEAR(db(2.0 * std::abs(line(part, 48000.0, 1000.0)) / 0.25), 0.0, 0.02) << m;
    }
}

TEST(SteadyLoudness, HoldsTheCarrierWhereTheFloorHidesIt) {
    const carrier_curve curve{std::vector{1.0, 2.0, 3.0, 4.0},
                              std::vector{0.4, not_measured, -1e-9, 0.2}};
    EXPECT_EQ(curve.at(0.0), 0.4);
    EXPECT_EQ(curve.at(1.0), 0.4);
    EXPECT_EQ(curve.at(2.5), 0.4); // held, not sloping to a record it cannot see
    EXPECT_EQ(curve.at(4.0), 0.2);
    EXPECT_EQ(curve.at(9.0), 0.2);
    EXPECT_NEAR(curve.median(), 0.3, 1e-12);
    EXPECT_TRUE(std::isnan(carrier_curve{}.at(1.0)));
}

TEST(SteadyLoudness, RefusesAGainAndARecordingWithoutACarrier) {
    const carrier_curve none{std::vector{1.0}, std::vector{not_measured}};
    const auto refused = [](const audio_options& o, const carrier_curve& c) {
        return caught([&] { (void)render(std::vector<float>(10), o, c); });
    };
    EXPECT_EQ(refused({.mode = loudness::steady}, none).kind, fault::malformed);
    const carrier_curve one{std::vector{1.0}, std::vector{0.1}};
    EXPECT_TRUE(refused({.mode = loudness::steady, .gain_db = 3.0}, one).says("--gain"));
    EXPECT_FALSE(refused({.mode = loudness::steady}, one).kind);
}

TEST(AudioLength, IsTheRoundedSpanAndTheSpoolIsCutOrFilledToIt) {
    EXPECT_EQ(audio_length(1.5, 44100.0), 66150);
    EXPECT_EQ(audio_length(1.00001, 48000.0), 48000);
    const std::vector<float> audio(9000, 0.5F);
    EXPECT_EQ(render(audio, {.gain_db = 0.0, .audio_samples = 8999}).audio,
              std::vector<float>(8999, 0.5F));
    const rendering longer = render(audio, {.gain_db = 0.0, .audio_samples = 20000});
    ASSERT_EQ(longer.audio.size(), 20000U);
    EXPECT_EQ(longer.audio[8999], 0.5F);
    EXPECT_EQ(peak_of(std::span{longer.audio}.subspan(9000)), 0.0);
}

TEST(AudioResult, UsesTheNamesOfTheContract) {
    const sheet s = describe(audio_result{.audio_rate_hz = 48000.0, .clipped_audio_samples = 3});
    for (const auto* key :
         {"audio_rate_hz", "audio_seconds", "gain_db", "full_scale_depth_percent"}) {
        EXPECT_NE(s.find(key), nullptr) << key;
    }
    ASSERT_NE(s.find("clipped_audio_samples"), nullptr);
    EXPECT_EQ(*s.find("clipped_audio_samples"), cell{std::int64_t{3}});
}

} // namespace
} // namespace tonewalk
