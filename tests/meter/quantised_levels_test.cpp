// SPDX-License-Identifier: GPL-3.0-or-later
#include <cmath>

#include <gtest/gtest.h>

#include "support/am_source.hpp"
#include "tonewalk/base/allowed_errors.hpp"

namespace tonewalk {
namespace {

using test::am_signal;

/// What a converter of `bits` makes of a signal to which it adds `noise_lsb`
/// rms a component.
std::vector<cf32> quantised(std::vector<cf32> samples, unsigned bits, double noise_lsb,
                            std::uint64_t seed) {
    random_stream random{seed, 91};
    const double scale = std::ldexp(1.0, static_cast<int>(bits) - 1);
    const auto component = [&](float x) {
        const double code =
            std::nearbyint(static_cast<double>(x) * scale + noise_lsb * random.gaussian());
        return static_cast<float>(std::clamp(code, -scale, scale - 1.0) / scale);
    };
    for (cf32& z : samples) {
        const float re = component(z.real()), im = component(z.imag());
        z = {re, im};
    }
    return samples;
}

level_log measured(const am_signal& s, const std::vector<cf32>& samples,
                   const test::meter_options& o) {
    line_meter meter{test::meter_config(s, o)};
    test::feed(meter, samples, o.cut);
    return meter.take_result();
}

TEST(QuantisedLevels, SixteenBitsWithOneLsbOfNoiseHoldDownToMinusNinety) {
    std::size_t records = 0, outside = 0;
    for (std::uint64_t seed = 1; seed <= 20; ++seed) {
        random_stream random{seed, 16};
        am_signal s;
        s.rate_hz = random.uniform(20e3, 40e3);
        s.offset_hz = random.uniform(-0.4, 0.4);
        s.tone_hz = random.uniform(300.0, 2500.0);
        s.depth = random.uniform(0.2, 0.95);
        const double peak_dbfs = -90.0 * static_cast<double>(seed - 1) / 19.0;
        s.carrier_dbfs = peak_dbfs - 20.0 * std::log10(1.0 + s.depth);
        s.phase = random.uniform(0.0, 6.28);
        s.tone_phase = random.uniform(0.0, 6.28);
        const std::vector<cf32> samples = quantised(test::generate(s, 4.01), 16, 1.0, seed);
        const double tone_dbfs = s.carrier_dbfs + 20.0 * std::log10(s.depth);
        const auto count = [&](const interval_estimate& level, double truth) {
            const double most = allowed("level_db.ci16_lsb");
            ++records;
            outside += truth > std::fmax(level.high95, level.value + most) ||
                               truth < std::fmin(level.low95, level.value - most)
                           ? 1U
                           : 0U;
        };
        for (const level_record& r :
             measured(s, samples, {.every_s = 0.2, .window_s = 0.2}).records) {
            count(r.carrier_dbfs, s.carrier_dbfs);
            count(r.tone_dbfs, tone_dbfs);
        }
    }
    EXPECT_EQ(records, 800U);
    // u95 holds 95 % of the truths; the strong half lies within 0.02 dB anyway.
    EXPECT_LE(static_cast<double>(outside), 0.05 * static_cast<double>(records));
}

struct rms_errors {
    double carrier_db = 0.0, tone_db = 0.0;
};

/// Of one window of 1 s at 48 kS/s, carrier -20 dBFS, m 0.3, over 200 seeds.
rms_errors of_format(unsigned bits, double noise_lsb) {
    constexpr std::uint64_t seeds = 200;
    rms_errors sum;
    for (std::uint64_t seed = 1; seed <= seeds; ++seed) {
        random_stream random{seed, bits};
        am_signal s;
        s.rate_hz = 48e3;
        s.offset_hz = random.uniform(-0.2, 0.2);
        s.tone_hz = random.uniform(900.0, 1100.0);
        s.phase = random.uniform(0.0, 6.28);
        s.tone_phase = random.uniform(0.0, 6.28);
        const level_log log = measured(s, quantised(test::generate(s, 1.0), bits, noise_lsb, seed),
                                       {.every_s = 1.0, .window_s = 1.0});
        const double carrier = log.records.at(0).carrier_dbfs.value - s.carrier_dbfs;
        const double tone =
            log.records.at(0).tone_dbfs.value - s.carrier_dbfs - 20.0 * std::log10(s.depth);
        sum.carrier_db += carrier * carrier / static_cast<double>(seeds);
        sum.tone_db += tone * tone / static_cast<double>(seeds);
    }
    const rms_errors e{std::sqrt(sum.carrier_db), std::sqrt(sum.tone_db)};
    ::testing::Test::RecordProperty("carrier_db", std::to_string(e.carrier_db));
    ::testing::Test::RecordProperty("tone_db", std::to_string(e.tone_db));
    return e;
}

TEST(CoverageQuantisedLevels, EightBitsWithOneLsbOfNoise) {
    const rms_errors e = of_format(8, 1.0);
    EXPECT_LE(e.carrier_db, allowed("datatype_carrier_db.8bit"));
    EXPECT_LE(e.tone_db, allowed("datatype_tone_db.8bit"));
}

TEST(CoverageQuantisedLevels, SixteenBitsWithAndWithoutNoise) {
    for (const double noise_lsb : {0.0, 1.0}) {
        const rms_errors e = of_format(16, noise_lsb);
        EXPECT_LE(e.carrier_db, allowed("datatype_carrier_db.16bit"));
        EXPECT_LE(e.tone_db, allowed("datatype_tone_db.16bit"));
    }
}

} // namespace
} // namespace tonewalk
