// SPDX-License-Identifier: GPL-3.0-or-later
#include <algorithm>
#include <cmath>
#include <complex>
#include <functional>
#include <numbers>
#include <vector>

#include <gtest/gtest.h>

#include "support/memory_source.hpp"
#include "tonewalk/base/random.hpp"
#include "tonewalk/meter/raw_watch.hpp"

namespace tonewalk::test {
namespace {

constexpr double two_pi = 2.0 * std::numbers::pi;
constexpr std::size_t samples = 200'000;

raw_result watch(const stream_facts& facts, const std::vector<std::byte>& frames) {
    std::vector<cf32> converted(samples);
    raw_counts counts;
    counts.cells.reserve(samples);
    counts.non_finite.reserve(samples);
    sample_converter{facts}.convert(frames, converted, 0, 1024, counts);
    raw_watch watcher{facts};
    watcher.add(counts, samples);
    return watcher.result();
}

/// What a converter that clips at full scale stores, as integers and as floats.
std::vector<raw_result> stored(const std::function<std::complex<double>(std::size_t)>& signal) {
    std::vector<std::int16_t> integers;
    std::vector<float> floats;
    for (std::size_t n = 0; n < samples; ++n) {
        const std::complex<double> z = signal(n);
        for (const double x : {z.real(), z.imag()}) {
            integers.push_back(
                static_cast<std::int16_t>(std::clamp(std::round(x * 32768.0), -32768.0, 32767.0)));
            floats.push_back(static_cast<float>(std::clamp(x, -1.0, 1.0)));
        }
    }
    return {watch(facts_of("ci16_le", 1e6, samples), bytes_of(integers)),
            watch(facts_of("cf32_le", 1e6, samples), bytes_of(floats))};
}

/// Two-sided 0.1 %: the normal distribution's 3.2905 sigma.
std::vector<raw_result> gaussian(double full_scale_sigmas) {
    random_stream random{17};
    return stored([&](std::size_t) {
        const double i = random.gaussian(), q = random.gaussian();
        return std::complex<double>{i, q} / full_scale_sigmas;
    });
}

TEST(RawClipping, OfOneSampleInAThousandIsSeenInNoiseLikeSignals) {
    for (const raw_result& r : gaussian(3.2905)) {
        EXPECT_TRUE(r.clipping_judged);
        EXPECT_NEAR(static_cast<double>(r.clipped_samples), 1e-3 * 2.0 * samples, 80.0); // 4 sigma
        EXPECT_TRUE(r.doubts.has(note_code::clipped));
    }
    for (const raw_result& r : gaussian(8.0)) {
        EXPECT_EQ(r.clipped_samples, 0U);
    }
}

/// Carrier with 80 % AM and a little noise, held at full scale where it passes `peak`.
std::vector<raw_result> modulated(double peak, double& beyond) {
    random_stream random{18};
    beyond = 0.0;
    return stored([&](std::size_t n) {
        const double t = static_cast<double>(n);
        const double a = peak / 1.8 * (1.0 + 0.8 * std::cos(two_pi * t * 0.00123456));
        const double re = random.gaussian(), im = random.gaussian();
        const std::complex<double> z =
            std::polar(a, two_pi * std::fmod(0.1234567 * t, 1.0)) + 1e-4 * cf64{re, im};
        beyond += (std::abs(z.real()) > 1.0 ? 1.0 : 0.0) + (std::abs(z.imag()) > 1.0 ? 1.0 : 0.0);
        return z;
    });
}

TEST(RawClipping, OfOneSampleInAThousandIsSeenInAmplitudeModulation) {
    double beyond = 0.0;
    for (const raw_result& r : modulated(1.00065, beyond)) {
        EXPECT_NEAR(beyond, 1e-3 * 2.0 * samples, 150.0);
        EXPECT_NEAR(static_cast<double>(r.clipped_samples), beyond, 0.05 * beyond + 5.0);
        EXPECT_TRUE(r.doubts.has(note_code::clipped));
    }
    for (const raw_result& r : modulated(0.98, beyond)) {
        EXPECT_EQ(r.clipped_samples, 0U);
        EXPECT_FALSE(r.doubts.has(note_code::clipped));
    }
}

// A cosine without noise whose period is a whole number of samples takes a few codes only: its
// extreme ones bear one sample a period each, those next to them none. That is no clipping.
TEST(RawClipping, IsNotSeenInPeriodsOfAFewSamples) {
    for (const std::size_t period : {5U, 48U, 480U, 2400U}) {
        for (const double amplitude : {0.1, 0.5, 0.98}) {
            for (const raw_result& r : stored([&](std::size_t n) {
                     const double turns =
                         static_cast<double>(n % period) / static_cast<double>(period);
                     return std::polar(amplitude, two_pi * turns);
                 })) {
                EXPECT_EQ(r.clipped_samples, 0U) << period << " samples at " << amplitude;
                EXPECT_FALSE(r.doubts.has(note_code::clipped));
            }
        }
    }
}

} // namespace
} // namespace tonewalk::test
