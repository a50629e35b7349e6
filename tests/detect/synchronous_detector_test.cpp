// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/detect/synchronous_detector.hpp"

#include <gtest/gtest.h>

#include "detect/signals.hpp"
#include "support/expect_error.hpp"
#include "tonewalk/detect/envelope_detector.hpp"
#include "tonewalk/maths/fir.hpp"

namespace tonewalk {
namespace {

using namespace test;

constexpr double rate_hz = 80000.0;

std::vector<float> synchronous(std::span<const cf32> in, std::uint64_t seed = 0) {
    synchronous_detector d{{.rate_hz = rate_hz}};
    return detect(d, in, seed);
}

/// 1 kHz tone amplitude over the mean, over whole seconds from `first_s` to the last full one.
double depth(std::span<const float> audio, double first_s) {
    const auto first = static_cast<std::size_t>(first_s * rate_hz);
    const auto second = static_cast<std::size_t>(rate_hz);
    const auto part = audio.subspan(first, (audio.size() - first) / second * second);
    return 2.0 * std::abs(line(part, rate_hz, 1000.0)) / line(part, rate_hz, 0.0).real();
}

TEST(SynchronousDetector, GivesTheModulationOfACleanCarrierUndelayed) {
    const auto in = baseband(160000, rate_hz, [](double t) {
        return std::polar(0.5, 2.0) * (1.0 + 0.3 * std::cos(turn * 1000.0 * t));
    });
    const std::vector<float> audio = synchronous(in);
    ASSERT_EQ(audio.size(), in.size());
    for (std::size_t n = 0; n < audio.size(); ++n) {
        const double t = static_cast<double>(n) / rate_hz;
        const double truth = 0.5 * (1.0 + 0.3 * std::cos(turn * 1000.0 * t));
        ASSERT_NEAR(static_cast<double>(audio[n]), truth, 2e-6) << n;
    }
}

TEST(SynchronousDetector, KeepsTheSignOfAFoldedCarrier) {
    const auto in = baseband(160000, rate_hz, [](double t) {
        return std::polar(0.5, -2.0) * (1.0 + 1.5 * std::cos(turn * 1000.0 * t));
    });
    const std::vector<float> audio = synchronous(in);
    EXPECT_NEAR(static_cast<double>(*std::min_element(audio.begin(), audio.end())), -0.25, 1e-4);
    EXPECT_NEAR(depth(audio, 0.0), 1.5, 1e-4);
}

TEST(SynchronousDetector, ReadsACarrierOffItsNominal) {
    for (const double off_hz : {-6.0, 3.3, 12.0}) {
        const auto in = baseband(240000, rate_hz, [&](double t) {
            return 0.5 * std::polar(1.0, turn * off_hz * t) *
                   (1.0 + 0.3 * std::cos(turn * 1000.0 * t));
        });
        EXPECT_NEAR(depth(synchronous(in), 1.0), 0.3, 3e-5) << off_hz;
    }
}

TEST(SynchronousDetector, FollowsADriftFarBeyondItsBandwidth) {
    constexpr double drift_hz_per_s = 1.0; // 60 Hz a minute
    const auto in = baseband(static_cast<std::size_t>(45.0 * rate_hz), rate_hz, [](double t) {
        return 0.5 * std::polar(1.0, turn * 0.5 * drift_hz_per_s * t * t) *
               (1.0 + 0.3 * std::cos(turn * 1000.0 * t));
    });
    synchronous_detector d{{.rate_hz = rate_hz}};
    const std::vector<float> audio = detect(d, in);
    EXPECT_NEAR(d.frame_hz(), 45.0, 1.5);
    for (double t = 1.0; t < 43.0; t += 3.0) {
        const auto second = std::span{audio}.subspan(static_cast<std::size_t>(t * rate_hz),
                                                     static_cast<std::size_t>(rate_hz));
        EXPECT_NEAR(depth(second, 0.0), 0.3, 1e-4) << t;
        EXPECT_NEAR(line(second, rate_hz, 0.0).real(), 0.5, 1e-4) << t;
    }
}

TEST(SynchronousDetector, HoldsItsFrequencyThroughALongSilence) {
    // 20 s of noise alone, 20 dB below the carrier in 80 kHz, between two stays of a carrier 5 Hz
    // off.
    auto in = baseband(static_cast<std::size_t>(26.0 * rate_hz), rate_hz, [](double t) {
        const double there = t < 3.0 || t > 23.0 ? 0.5 : 0.0;
        return there * std::polar(1.0, turn * 5.0 * t) * (1.0 + 0.3 * std::cos(turn * 1000.0 * t));
    });
    add_noise(in, 0.0025, 21);
    synchronous_detector d{{.rate_hz = rate_hz}};
    const std::vector<float> audio = detect(d, in);
    EXPECT_NEAR(d.frame_hz(), 5.0, 1.0);
    EXPECT_NEAR(depth(std::span{audio}.subspan(static_cast<std::size_t>(23.5 * rate_hz)), 0.0), 0.3,
                0.003);
}

// DSP-21 and DSP-22: at a carrier-to-noise ratio of 0 dB in the channel an envelope shows 0.55407
// of a small depth, at 6 dB 0.87101; in-phase detection shows all of it.
TEST(SynchronousDetector, ShowsTheDepthInNoiseWhereAnEnvelopeSinks) {
    const auto taps =
        design_low_pass({.rate_hz = rate_hz, .pass_edge_hz = 10000.0, .stop_edge_hz = 15000.0});
    double bandwidth_hz = 0.0;
    for (const double tap : taps) {
        bandwidth_hz += tap * tap * rate_hz;
    }
    for (const auto& [ratio_db, factor] : {std::pair{0.0, 0.55407}, {6.0, 0.87101}}) {
        auto in = baseband(static_cast<std::size_t>(30.0 * rate_hz), rate_hz, [](double t) {
            return cf64{0.1 * (1.0 + 0.3 * std::cos(turn * 1000.0 * t))};
        });
        const double noise = 0.01 * std::pow(10.0, -ratio_db / 10.0);
        add_noise(in, noise * rate_hz / bandwidth_hz, 33);
        fir_stage<cf32> channel{{.taps = taps}};
        std::vector<cf32> narrow;
        channel.begin();
        channel.add(in, narrow);
        channel.end(narrow);
        envelope_detector envelope{{.rate_hz = rate_hz, .width_hz = 20000.0}};
        EXPECT_NEAR(depth(detect(envelope, narrow), 1.0) / 0.3, factor, 0.05 * factor);
        EXPECT_NEAR(depth(synchronous(narrow), 1.0) / 0.3, 1.0, 0.02); // 4 sigma of 28 s
    }
}

TEST(SynchronousDetector, GivesTheSameBitsHoweverTheInputIsCut) {
    auto in = baseband(120000, rate_hz, [](double t) {
        return std::polar(0.3 + 0.2 * std::cos(turn * 700.0 * t), 9.0 * t + t * t);
    });
    add_noise(in, 1e-3, 4);
    const std::vector<float> whole = synchronous(in);
    EXPECT_EQ(whole.size(), in.size());
    EXPECT_EQ(synchronous(in, 1), whole);
    EXPECT_EQ(synchronous(in, 2), whole);
}

TEST(SynchronousDetector, IsSilentWithoutACarrier) {
    const std::vector<cf32> in(20000);
    for (const float sample : synchronous(in)) {
        ASSERT_EQ(sample, 0.0F);
    }
}

TEST(SynchronousDetector, RefusesTooFewSamples) {
    EXPECT_EQ(caught([] { synchronous_detector d({.rate_hz = 50.0}); }).kind, fault::bad_request);
}

} // namespace
} // namespace tonewalk
