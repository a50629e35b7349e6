// SPDX-License-Identifier: GPL-3.0-or-later
#include <cmath>
#include <string>
#include <utility>

#include <gtest/gtest.h>

#include "support/am_source.hpp"
#include "tonewalk/base/allowed_errors.hpp"
#include "tonewalk/maths/fir.hpp"

namespace tonewalk {
namespace {

using test::am_signal;
using test::meter_options;

constexpr std::uint64_t seeds = 1000, many_seeds = 4000;

double decibels(double amplitude) {
    return 20.0 * std::log10(amplitude);
}

/// How often intervals held the truth, and how their width compares with the errors.
class coverage {
public:
    void add(const interval_estimate& found, double truth) {
        ++records_;
        below_low_ += truth < found.low95 ? 1.0 : 0.0; // never where nothing bounds it below
        above_high_ += truth > found.high95 || std::isnan(found.high95) ? 1.0 : 0.0;
        if (!std::isnan(found.u95)) {
            ++symmetric_;
            u95_ += found.u95;
            squares_ += (found.value - truth) * (found.value - truth);
        }
    }
    void expect_ordinary(const std::string& what) const {
        const double held = held_percent();
        EXPECT_GE(held, allowed("coverage_percent.low")) << what << report();
        EXPECT_LE(held, allowed("coverage_percent.high")) << what << report();
        expect_width(what);
    }
    void expect_long(const std::string& what) const {
        EXPECT_GE(held_percent(), allowed("coverage_percent.long_low")) << what << report();
        EXPECT_LE(held_percent(), allowed("coverage_percent.long_high")) << what << report();
        for (const double tail : {below_low_, above_high_}) {
            EXPECT_GE(100.0 * tail / records_, allowed("coverage_tail_percent.long_low"))
                << what << report();
            EXPECT_LE(100.0 * tail / records_, allowed("coverage_tail_percent.long_high"))
                << what << report();
        }
        expect_width(what);
    }
    void expect_at_the_floor(const std::string& what) const {
        EXPECT_GE(held_percent(), allowed("coverage_percent.floor_low")) << what << report();
        EXPECT_LE(held_percent(), allowed("coverage_percent.floor_high")) << what << report();
        const double most = allowed("coverage_tail_percent.long_high");
        EXPECT_LE(100.0 * below_low_ / records_, most) << what << report();
        EXPECT_LE(100.0 * above_high_ / records_, most) << what << report();
        expect_width(what);
    }

private:
    [[nodiscard]] double held_percent() const {
        return 100.0 * (1.0 - (below_low_ + above_high_) / records_);
    }
    void expect_width(const std::string& what) const {
        if (symmetric_ > 500.0) {
            const double scatter = std::sqrt(squares_ / symmetric_);
            EXPECT_LE(u95_ / symmetric_, allowed("u95_ratio") * 1.96 * scatter) << what;
        }
    }
    [[nodiscard]] std::string report() const {
        return ": below " + std::to_string(below_low_) + ", above " + std::to_string(above_high_) +
               " of " + std::to_string(records_);
    }
    double records_ = 0.0, below_low_ = 0.0, above_high_ = 0.0;
    double symmetric_ = 0.0, u95_ = 0.0, squares_ = 0.0;
};

struct level_coverage {
    coverage carrier, tone, depth;
    void add(const level_log& log, const am_signal& s) {
        for (const level_record& r : log.records) {
            carrier.add(r.carrier_dbfs, s.carrier_dbfs);
            tone.add(r.tone_dbfs, s.carrier_dbfs + decibels(s.depth));
            depth.add(r.depth_percent, 100.0 * s.depth);
        }
    }
};

struct experiment {
    double carrier_snr_db = 40.0; // line power over N
    double least_depth = 0.25, most_depth = 0.9;
    double incidental_phase = 0.0;
    double window_s = 0.2, width_hz = 0.0, seconds = 1.01;
};

/// Rates, offsets, tones, phases and depths drawn from the seed, none commensurate.
am_signal drawn(const experiment& e, std::uint64_t seed) {
    random_stream random{seed, 77};
    am_signal s;
    s.seed = seed;
    s.rate_hz = random.uniform(7.5e3, 8.5e3);
    s.offset_hz = random.uniform(-0.5, 0.5);
    s.tone_hz = random.uniform(420.0, 700.0);
    s.depth = random.uniform(e.least_depth, e.most_depth);
    s.phase = random.uniform(0.0, 6.28);
    s.tone_phase = random.uniform(0.0, 6.28);
    s.carrier_dbfs = random.uniform(-60.0, -10.0);
    s.incidental_phase = e.incidental_phase;
    const double line_noise =
        std::pow(10.0, (s.carrier_dbfs - e.carrier_snr_db) / 10.0); // N = N0 1.5 / T
    s.noise_density = line_noise * e.window_s / 1.5;
    return s;
}

level_coverage run(const experiment& e, std::uint64_t last_seed = seeds) {
    level_coverage all;
    for (std::uint64_t seed = 1; seed <= last_seed; ++seed) {
        const am_signal s = drawn(e, seed);
        meter_options o;
        o.every_s = o.window_s = e.window_s; // windows do not overlap
        o.width_hz = e.width_hz;
        all.add(test::measure(s, e.seconds, o), s);
    }
    return all;
}

TEST(CoverageOfLevels, FarAboveTheNoise) {
    const level_coverage c = run({.carrier_snr_db = 45.0});
    c.carrier.expect_ordinary("carrier");
    c.tone.expect_ordinary("tone");
    c.depth.expect_ordinary("depth");
}

TEST(CoverageOfLevels, WhereTheCarrierCanJustBeSplit) {
    const level_coverage c = run({.carrier_snr_db = 21.0});
    c.carrier.expect_ordinary("carrier");
    c.tone.expect_at_the_floor("tone"); // 9 to 20 dB below the carrier
    c.depth.expect_at_the_floor("depth");
}

TEST(CoverageOfLevels, AtTheFloor) {
    for (const double snr_db : {15.0, 9.0, 3.0}) {
        const level_coverage c = run({.carrier_snr_db = snr_db});
        const std::string at = " at " + std::to_string(snr_db) + " dB";
        c.carrier.expect_at_the_floor("carrier" + at);
        c.tone.expect_at_the_floor("tone" + at);
    }
}

TEST(CoverageOfLevels, WithNoiseFromFewLinesOfNeighbours) {
    // 25 ms: 40 Hz bins; 2 kHz hold 50 lines, of which the fitted ones spoil all but some.
    const experiment e{
        .carrier_snr_db = 30.0, .window_s = 0.025, .width_hz = 1700.0, .seconds = 0.13};
    const level_coverage c = run(e);
    c.carrier.expect_ordinary("carrier");
    c.tone.expect_at_the_floor("tone");
}

/// Noise enters before the channel filter, whose droop the meter undoes.
TEST(CoverageOfLevels, BehindAChannelFilter) {
    level_coverage all;
    for (std::uint64_t seed = 1; seed <= seeds; ++seed) {
        const experiment e{.carrier_snr_db = 35.0};
        am_signal s = drawn(e, seed);
        s.tone_hz *= 1.6; // out to where the filter has begun to fall
        const std::vector<double> taps = design_low_pass({.rate_hz = s.rate_hz,
                                                          .pass_edge_hz = 400.0,
                                                          .stop_edge_hz = 2000.0,
                                                          .attenuation_db = 60.0});
        const std::vector<cf32> raw = test::generate(s, 1.02);
        std::vector<cf32> filtered(raw.size() - taps.size() + 1);
        for (std::size_t n = 0; n < filtered.size(); ++n) {
            cf64 sum{};
            for (std::size_t k = 0; k < taps.size(); ++k) {
                sum += taps[k] * cf64{raw[n + k]};
            }
            filtered[n] = cf32{sum};
        }
        meter_options o;
        o.every_s = o.window_s = e.window_s;
        o.width_hz = 2.4 * s.tone_hz;
        line_meter::config c = test::meter_config(s, o);
        c.response = [&](double hz) { return symmetric_response(taps, s.rate_hz, hz); };
        line_meter meter{c};
        test::feed(meter, filtered, 4093);
        all.add(meter.take_result(), s);
    }
    all.carrier.expect_ordinary("carrier");
    all.tone.expect_ordinary("tone");
    all.depth.expect_ordinary("depth");
}

TEST(SlowCoverageOfLevels, FarAboveTheNoise) {
    const level_coverage c = run({.carrier_snr_db = 45.0}, many_seeds);
    c.carrier.expect_long("carrier");
    c.tone.expect_long("tone");
    c.depth.expect_long("depth");
}

TEST(SlowCoverageOfLevels, TwelveDecibelsAboveTheNoiseAndAtTheFloor) {
    for (const double snr_db : {12.0, 5.0, 0.0}) {
        const level_coverage c = run({.carrier_snr_db = snr_db}, many_seeds);
        const std::string at = " at " + std::to_string(snr_db) + " dB";
        c.carrier.expect_at_the_floor("carrier" + at);
        c.tone.expect_at_the_floor("tone" + at);
    }
}

} // namespace
} // namespace tonewalk
