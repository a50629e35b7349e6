// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/meter/raw_watch.hpp"

#include <cmath>
#include <complex>
#include <functional>
#include <limits>
#include <numbers>
#include <vector>

#include <gtest/gtest.h>

#include "support/memory_source.hpp"
#include "tonewalk/base/random.hpp"

namespace tonewalk::test {
namespace {

constexpr double two_pi = 2.0 * std::numbers::pi;
constexpr std::size_t samples = 100'000;
/// Turns a sample of whole numbers of periods in `samples`, with no short repetition.
constexpr double turns_a_sample = 12'347.0 / static_cast<double>(samples);

double db(double amplitude) {
    return 20.0 * std::log10(amplitude);
}

raw_result watch(const stream_facts& facts, const std::vector<std::byte>& frames) {
    const std::size_t count = frames.size() / facts.frame_bytes();
    std::vector<cf32> converted(count);
    raw_counts counts;
    counts.cells.reserve(count / 1024 + 1);
    counts.non_finite.reserve(count / 1024 + 1);
    sample_converter{facts}.convert(frames, converted, 0, 1024, counts);
    raw_watch watcher{facts};
    watcher.add(counts, count);
    return watcher.result();
}

using signal = std::function<std::complex<double>(double angle)>; // angle of the tone, rad

template <class Stored>
std::vector<Stored> stored(const signal& at, double full_scale, std::int32_t grid = 1) {
    std::vector<Stored> out;
    for (std::size_t n = 0; n < samples; ++n) {
        const auto z = at(two_pi * std::fmod(turns_a_sample * static_cast<double>(n), 1.0));
        for (const double x : {z.real(), z.imag()}) {
            const double top = std::floor((full_scale - 1.0) / grid) * grid;
            const double code = std::round(x * full_scale / grid) * grid;
            out.push_back(static_cast<Stored>(std::clamp(code, -full_scale, top)));
        }
    }
    return out;
}

raw_result watch_ci16(const signal& at) {
    return watch(facts_of("ci16_le", 1e6, samples), bytes_of(stored<std::int16_t>(at, 32768.0)));
}

raw_result watch_cf32(const signal& at) {
    std::vector<cf32> iq(samples);
    for (std::size_t n = 0; n < samples; ++n) {
        iq[n] = cf32{at(two_pi * std::fmod(turns_a_sample * static_cast<double>(n), 1.0))};
    }
    return watch(facts_of("cf32_le", 1e6, samples), bytes_of(iq));
}

signal circle(double amplitude) {
    return [amplitude](double angle) { return std::polar(amplitude, angle); };
}

/// Each component held at `limit`, as a converter holds what lies beyond its range.
signal held_at(double limit, signal at) {
    return [limit, at = std::move(at)](double angle) {
        const auto z = at(angle);
        return std::complex<double>{std::clamp(z.real(), -limit, limit),
                                    std::clamp(z.imag(), -limit, limit)};
    };
}

TEST(RawWatch, ConstantEnvelopeReadsItsMagnitude) {
    const raw_result r = watch_cf32(circle(0.5));
    EXPECT_NEAR(r.rms_dbfs, db(0.5), 1e-6);
    EXPECT_NEAR(r.peak_dbfs, db(0.5), 1e-6);
    EXPECT_NEAR(r.peak_component_dbfs, db(0.5), 1e-6);
    EXPECT_LT(r.dc_dbfs, -120.0);
    EXPECT_NEAR(r.headroom_db, -db(0.5), 1e-6);
    EXPECT_EQ(r.samples, static_cast<sample_index>(samples));
    EXPECT_TRUE(r.doubts.all().empty());
}

TEST(RawWatch, RealSineOfFullScaleIsZeroDecibels) {
    std::vector<float> sine(samples);
    for (std::size_t n = 0; n < samples; ++n) {
        sine[n] = static_cast<float>(
            std::sin(two_pi * std::fmod(turns_a_sample * static_cast<double>(n), 1.0)));
    }
    const raw_result r = watch(facts_of("rf32_le", 1e6, samples), bytes_of(sine));
    EXPECT_NEAR(r.rms_dbfs, 0.0, 1e-6);
    EXPECT_NEAR(r.peak_dbfs, 0.0, 1e-6);
    EXPECT_NEAR(r.headroom_db, 0.0, 1e-6);
}

TEST(RawWatch, OffsetIsToldFromTheSignal) {
    const std::complex<double> offset{0.03, -0.04};
    const raw_result r = watch_cf32([&](double angle) { return std::polar(0.5, angle) + offset; });
    EXPECT_NEAR(r.dc_dbfs, db(0.05), 1e-5);
    EXPECT_NEAR(r.rms_dbfs, 10.0 * std::log10(0.25 + 0.0025), 1e-6);
    EXPECT_NEAR(r.peak_dbfs, db(0.55), 1e-4);    // both in line once in a while
    EXPECT_NEAR(r.headroom_db, -db(0.54), 1e-4); // Q, which the offset pulls furthest
}

TEST(RawWatch, CleanSignalsAreNotCalledClipped) {
    for (const double amplitude : {0.9999, 0.5, 0.123456, 0.01, 0.002}) {
        EXPECT_EQ(watch_ci16(circle(amplitude)).clipped_samples, 0U) << amplitude;
        EXPECT_TRUE(watch_ci16(circle(amplitude)).clipping_judged) << amplitude;
        EXPECT_EQ(watch_cf32(circle(amplitude)).clipped_samples, 0U) << amplitude;
    }
    for (const double fading_db : {20.0, 60.0}) { // cosine-shaped in dB, three times
        const raw_result r = watch_ci16([fading_db, n = 0.0](double angle) mutable {
            const double turn = 3.0 * n++ / samples;
            const double level_db = fading_db / 2.0 * (std::cos(two_pi * turn) - 1.0);
            return std::polar(0.7 * std::pow(10.0, level_db / 20.0), angle);
        });
        EXPECT_EQ(r.clipped_samples, 0U) << fading_db;
    }
    random_stream random{3};
    const raw_result noise = watch_ci16([&](double) {
        const double i = random.gaussian();
        return 0.1 * std::complex<double>{i, random.gaussian()};
    });
    EXPECT_EQ(noise.clipped_samples, 0U);
    EXPECT_TRUE(noise.clipping_judged);
    EXPECT_FALSE(noise.doubts.has(note_code::clipped));
}

TEST(RawWatch, ClippedSamplesAreThoseOnTheOutermostCode) {
    // Share of a circle's component beyond a share x of its amplitude: acos(x) / pi on each rail.
    for (const double limit : {0.9, 0.99}) {
        const double expected = 4.0 * samples * std::acos(limit) / std::numbers::pi;
        for (const bool full_scale : {false, true}) { // or wherever the chain before it clipped
            const double scale = full_scale ? 1.0 : 0.37;
            const auto clipped = held_at(limit * scale / limit, circle(scale / limit));
            const raw_result of_ci16 = watch_ci16(clipped), of_cf32 = watch_cf32(clipped);
            for (const raw_result& r : {of_ci16, of_cf32}) {
                EXPECT_NEAR(static_cast<double>(r.clipped_samples), expected, 0.02 * expected);
                EXPECT_TRUE(r.doubts.has(note_code::clipped));
            }
        }
    }
}

TEST(RawWatch, OneRailAloneCanClip) {
    const raw_result r = watch_ci16([](double angle) {
        const auto z = std::polar(0.6, angle);
        return std::complex<double>{std::min(z.real(), 0.5), z.imag()};
    });
    const double expected = samples * std::acos(0.5 / 0.6) / std::numbers::pi;
    // The positive rail's outermost codes are Q's clean peaks at 0.6: nothing is held there.
    EXPECT_EQ(r.clipped_samples, 0U);
    const raw_result both = watch_ci16([](double angle) {
        const auto z = std::polar(0.6, angle);
        return std::complex<double>{std::min(z.real(), 0.5), std::min(z.imag(), 0.5)};
    });
    EXPECT_NEAR(static_cast<double>(both.clipped_samples), 2.0 * expected, 0.02 * expected);
}

/// Codes 1000, 999, 998, 997 so often, and a spread of lower ones.
raw_result watch_rail(std::size_t on_extreme, std::size_t on_each_next) {
    std::vector<std::int16_t> codes(on_extreme, 1000);
    for (const std::int16_t code : {std::int16_t{999}, std::int16_t{998}, std::int16_t{997}}) {
        codes.insert(codes.end(), on_each_next, code);
    }
    for (int code = -996; code <= 996; ++code) {
        codes.insert(codes.end(), 10, static_cast<std::int16_t>(code));
    }
    codes.resize(codes.size() / 2 * 2);
    return watch(facts_of("ci16_le", 1e6, codes.size() / 2), bytes_of(codes));
}

TEST(RawWatch, RuleIsFourTimesTheMeanOfTheNextThreeCodes) {
    EXPECT_EQ(watch_rail(39'000, 10'000).clipped_samples, 0U);
    EXPECT_FALSE(watch_rail(39'000, 10'000).doubts.has(note_code::clipped));
    EXPECT_EQ(watch_rail(42'000, 10'000).clipped_samples, 42'000U);
    EXPECT_TRUE(watch_rail(42'000, 10'000).doubts.has(note_code::clipped));
    EXPECT_EQ(watch_rail(8, 1).clipped_samples, 0U); // a handful is chance
}

TEST(RawWatch, FewerThanSixtyFourCodesAreNotJudged) {
    const auto judged = [](double amplitude) {
        const auto codes = stored<std::int8_t>(held_at(0.9 * amplitude, circle(amplitude)), 128.0);
        return watch(facts_of("ci8", 1e6, samples), bytes_of(codes));
    };
    EXPECT_FALSE(judged(0.26).clipping_judged); // +-30 codes
    EXPECT_EQ(judged(0.26).clipped_samples, 0U);
    EXPECT_TRUE(judged(0.30).clipping_judged); // +-35
    EXPECT_GT(judged(0.30).clipped_samples, 0U);
}

TEST(RawWatch, GridCoarserThanTheCodesIsNoClipping) {
    const stream_facts ci16 = facts_of("ci16_le", 1e6, samples);
    const auto left_aligned = [&](const signal& at) {
        return watch(ci16, bytes_of(stored<std::int16_t>(at, 32768.0, 16))); // 12 bits in 16
    };
    EXPECT_EQ(left_aligned(circle(0.8)).clipped_samples, 0U);
    EXPECT_TRUE(left_aligned(circle(0.8)).clipping_judged);
    EXPECT_GT(left_aligned(circle(1.2)).clipped_samples, 10'000U); // held at full scale
    EXPECT_TRUE(left_aligned(circle(1.2)).clipping_judged);

    const auto once_integers = [&](double full_scale, const signal& at) {
        std::vector<float> floats;
        for (const std::int16_t code : stored<std::int16_t>(at, full_scale)) {
            floats.push_back(static_cast<float>(code / full_scale));
        }
        return watch(facts_of("cf32_le", 1e6, samples), bytes_of(floats));
    };
    for (const double full_scale : {32768.0, 2048.0, 128.0}) {
        for (const double amplitude : {0.9, 0.6, 0.2, 0.02}) {
            EXPECT_EQ(once_integers(full_scale, circle(amplitude)).clipped_samples, 0U)
                << full_scale << ", " << amplitude;
        }
        EXPECT_GT(once_integers(full_scale, circle(1.2)).clipped_samples, 10'000U) << full_scale;
    }
}

TEST(RawWatch, SamplesThatAreNoNumbersAreLeftOutAndCounted) {
    std::vector<cf32> iq(5000, cf32{0.3F, 0.4F});
    for (const std::size_t n : {std::size_t{7}, std::size_t{600}, std::size_t{4000}}) {
        iq[n] = {std::numeric_limits<float>::quiet_NaN(), 0.0F};
    }
    const stream_facts facts = facts_of("cf32_le", 1e6, iq.size());
    const raw_result r = watch(facts, bytes_of(iq));
    EXPECT_NEAR(r.rms_dbfs, db(0.5), 1e-6); // exactly the others' mean
    ASSERT_TRUE(r.doubts.has(note_code::non_finite_samples));
    EXPECT_EQ(r.doubts.all().back().text.substr(0, 9), "3 samples");

    const raw_result none =
        watch(facts, bytes_of(std::vector<float>(10'000, std::numeric_limits<float>::infinity())));
    EXPECT_TRUE(std::isnan(none.rms_dbfs));
    EXPECT_TRUE(none.doubts.has(note_code::non_finite_samples));
}

TEST(RawWatch, NothingMeasuredIsNull) {
    const stream_facts facts = facts_of("cf32_le", 1e6, 0);
    const raw_result r = raw_watch{facts}.result();
    EXPECT_EQ(r.samples, 0);
    EXPECT_TRUE(std::isnan(r.rms_dbfs));
    const sheet s = describe(r);
    EXPECT_TRUE(std::holds_alternative<std::monostate>(*s.find("clipped_samples")));
}

TEST(RawWatch, SheetCarriesTheKeysOfLook) {
    const sheet s = describe(watch_ci16(circle(0.5)));
    for (const char* const key :
         {"rms_dbfs", "peak_dbfs", "peak_component_dbfs", "headroom_db", "dc_dbfs"}) {
        ASSERT_NE(s.find(key), nullptr) << key;
        EXPECT_TRUE(std::holds_alternative<double>(*s.find(key))) << key;
    }
    EXPECT_EQ(std::get<std::int64_t>(*s.find("clipped_samples")), 0);
}

} // namespace
} // namespace tonewalk::test
