// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/meter/compression_watch.hpp"

#include <cmath>
#include <complex>
#include <functional>
#include <numbers>
#include <string>
#include <vector>

#include <gtest/gtest.h>

#include "support/am_source.hpp"

namespace tonewalk {
namespace {

using test::am_signal;
using curve_of_envelope = std::function<double(double)>;

constexpr double seconds = 30.0;
constexpr double peak_dbfs = -10.0;

am_signal fading_signal(double fade_db) {
    am_signal s;
    s.rate_hz = 8e3;
    s.carrier_dbfs = peak_dbfs;
    s.tone_hz = 503.3;
    s.depth = 0.6;
    s.offset_hz = 1.7;
    s.noise_density = std::pow(10.0, (peak_dbfs - 70.0) / 10.0);
    s.field = [fade_db](double t) {
        const double db = -fade_db * 0.5 * (1.0 - std::cos(2.0 * std::numbers::pi * t / 10.0));
        return std::polar(std::pow(10.0, db / 20.0), 0.3 * t);
    };
    return s;
}

compression_watch::config watch_config(const am_signal& s) {
    return {.rate_hz = s.rate_hz, .tone_hz = s.tone_hz, .width_hz = 3e3};
}

/// The envelope sent through a curve; before noise where none is given by the signal.
std::vector<cf32> bent(const am_signal& s, const curve_of_envelope& curve) {
    std::vector<cf32> samples = test::generate(s, seconds);
    for (cf32& z : samples) {
        const double e = std::abs(cf64{z});
        z *= static_cast<float>(e > 0.0 ? curve(e) / e : 1.0);
    }
    return samples;
}

compression_result watched(const am_signal& s, const std::vector<cf32>& samples,
                           std::size_t cut = 4093) {
    compression_watch watch{watch_config(s)};
    test::feed(watch, samples, cut);
    return watch.result();
}

/// r / sqrt(1 + r^2/s^2) that takes `loss_db` off the highest crest.
curve_of_envelope saturating(const am_signal& s, double loss_db) {
    const double crest = std::pow(10.0, peak_dbfs / 20.0) * (1.0 + s.depth);
    const double square = crest * crest / (std::pow(10.0, loss_db / 10.0) - 1.0);
    return [square](double e) { return e / std::sqrt(1.0 + e * e / square); };
}

TEST(Compression, OfStrongSignalsIsNotedWithItsSize) {
    const am_signal s = fading_signal(20.0);
    for (const double loss_db : {0.3, 1.0, 2.0}) {
        const compression_result r = watched(s, bent(s, saturating(s, loss_db)));
        EXPECT_TRUE(r.judged);
        EXPECT_TRUE(r.compressed) << r.evidence;
        EXPECT_TRUE(r.doubts.has(note_code::compressed));
        EXPECT_NEAR(r.compression_db.value, loss_db, 0.12 * loss_db + r.compression_db.u95);
        EXPECT_NEAR(r.level_range_db, 20.0, 3.0);
    }
}

TEST(Compression, OfAHardLimitIsNoted) {
    const am_signal s = fading_signal(20.0);
    const double limit = std::pow(10.0, peak_dbfs / 20.0) * 1.3; // of crests at 1.6
    const compression_result r =
        watched(s, bent(s, [limit](double e) { return std::min(e, limit); }));
    EXPECT_TRUE(r.compressed) << r.evidence;
}

TEST(Compression, IsNoneInCleanFades) {
    for (const double fade_db : {20.0, 60.0}) {
        for (const double density_dbhz : {55.0, 90.0, 140.0}) {
            am_signal s = fading_signal(fade_db);
            s.noise_density = std::pow(10.0, (peak_dbfs - density_dbhz) / 10.0);
            const compression_result r = watched(s, test::generate(s, seconds));
            EXPECT_FALSE(r.compressed) << fade_db << " dB, " << density_dbhz;
            EXPECT_TRUE(r.doubts.all().empty());
        }
    }
}

/// As a transmitter distorts, before the path: an eighth of its crests' height squared is missing.
TEST(Compression, IsNoneWhereTheTransmitterDistorts) {
    am_signal s = fading_signal(20.0);
    const auto fading = s.field;
    s.field = {};
    s.noise_density = 0.0;
    const double peak = std::pow(10.0, peak_dbfs / 20.0);
    std::vector<cf32> samples =
        bent(s, [peak](double e) { return e * (1.0 - 0.05 * std::pow(e / peak, 2)); });
    for (std::size_t n = 0; n < samples.size(); ++n) {
        samples[n] *= cf32{fading(static_cast<double>(n) / s.rate_hz)};
    }
    const compression_result r = watched(s, samples);
    EXPECT_TRUE(r.judged) << r.evidence;
    EXPECT_FALSE(r.compressed) << r.evidence;
}

/// Two paths 1.5 ms apart: carrier, tone and harmonic fade each in its own way, nulls included.
TEST(Compression, IsNoneInSelectiveFades) {
    am_signal s = fading_signal(0.0);
    s.field = {};
    const double peak = std::pow(10.0, peak_dbfs / 20.0);
    for (const double share : {-0.05, 0.05}) {
        const std::vector<cf32> sent =
            bent(s, [=](double e) { return e * (1.0 + share * std::pow(e / peak, 2)); });
        std::vector<cf32> samples = sent;
        for (std::size_t n = 12; n < samples.size(); ++n) {
            const double turns = static_cast<double>(n) / s.rate_hz / 8.0;
            samples[n] += sent[n - 12] * cf32{std::polar(0.8, 2.0 * std::numbers::pi * turns)};
        }
        const compression_result r = watched(s, samples);
        EXPECT_FALSE(r.compressed) << share << ": " << r.evidence;
    }
}

TEST(Compression, IsNotJudgedWhereNothingCanTellIt) {
    am_signal steady = fading_signal(1.0);
    const compression_result still = watched(steady, bent(steady, saturating(steady, 1.0)));
    EXPECT_FALSE(still.judged);
    EXPECT_NE(still.evidence.find("cannot be told apart"), std::string::npos) << still.evidence;

    const am_signal s = fading_signal(20.0);
    compression_watch::config narrow = watch_config(s);
    narrow.width_hz = 3.9 * s.tone_hz;
    compression_watch watch{narrow};
    test::feed(watch, test::generate(s, seconds), 4093);
    EXPECT_FALSE(watch.result().judged);

    am_signal drowned = fading_signal(20.0);
    drowned.noise_density = std::pow(10.0, (peak_dbfs - 25.0) / 10.0);
    const compression_result weak = watched(drowned, test::generate(drowned, seconds));
    EXPECT_FALSE(weak.judged);
    EXPECT_FALSE(weak.compressed);
    EXPECT_FALSE(compression_watch{watch_config(s)}.result().judged); // nothing was heard
}

TEST(Compression, DoesNotDependOnHowSamplesAreCut) {
    const am_signal s = fading_signal(20.0);
    const std::vector<cf32> samples = bent(s, saturating(s, 1.0));
    const compression_result whole = watched(s, samples, samples.size());
    for (const std::size_t cut : {std::size_t{1}, std::size_t{777}, std::size_t{50'000}}) {
        const compression_result r = watched(s, samples, cut);
        EXPECT_EQ(r.compression_db.value, whole.compression_db.value) << cut;
        EXPECT_EQ(r.compression_db.u95, whole.compression_db.u95) << cut;
        EXPECT_EQ(r.evidence, whole.evidence) << cut;
    }
}

TEST(Compression, LeavesOutSamplesThatDoNotCount) {
    const am_signal s = fading_signal(20.0);
    std::vector<cf32> samples = test::generate(s, seconds);
    const sample_range bad{100'000, 500};
    for (sample_index n = bad.first; n < bad.first + bad.count; ++n) {
        samples[static_cast<std::size_t>(n)] = cf32{100.0F, 0.0F};
    }
    compression_watch watch{watch_config(s)};
    watch.begin_stretch({.index = 0, .held = false}); // as strange, but not measured at all
    watch.add({std::vector<cf32>(20'000, cf32{7.0F, 1.0F}), 0, {}});
    watch.end_stretch();
    watch.begin_stretch({.index = 1});
    watch.add({samples, 0, {&bad, 1}});
    watch.end_stretch();
    watch.finish();
    const compression_result r = watch.result();
    EXPECT_TRUE(r.judged) << r.evidence;
    EXPECT_FALSE(r.compressed);
    EXPECT_LT(std::abs(r.compression_db.value), 0.05);
}

TEST(Compression, SheetIsNullWhereNothingWasJudged) {
    const sheet none = describe(compression_result{});
    EXPECT_TRUE(std::holds_alternative<std::monostate>(*none.find("compressed")));
    compression_result judged;
    judged.judged = true;
    EXPECT_FALSE(std::get<bool>(*describe(judged).find("compressed")));
}

} // namespace
} // namespace tonewalk
