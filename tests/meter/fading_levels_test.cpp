// SPDX-License-Identifier: GPL-3.0-or-later
#include <cmath>
#include <numbers>

#include <gtest/gtest.h>

#include "support/am_source.hpp"
#include "tonewalk/base/allowed_errors.hpp"

namespace tonewalk {
namespace {

/// Below the noise for 15 s, up, a fade of 15 s, up again; drifting 5 Hz a
/// minute and swinging by half a hertz a minute all the while.
struct fading {
    static constexpr double seconds = 75.0, deep_db = -45.0;
    static bool faded(double t) { return t < 15.0 || (t >= 35.0 && t < 50.0); }
    static bool changes(double t) { // within a window of a change
        return std::abs(t - 15.0) < 0.15 || std::abs(t - 35.0) < 0.15 || std::abs(t - 50.0) < 0.15;
    }
    static test::am_signal signal(std::uint64_t seed) {
        test::am_signal s;
        s.seed = seed;
        s.rate_hz = 8e3;
        s.tone_hz = 503.3;
        s.depth = 0.6;
        const double line_snr_db = 32.0;
        s.noise_density = std::pow(10.0, (s.carrier_dbfs - line_snr_db) / 10.0) * 0.2 / 1.5;
        s.cycles = [](double t) {
            const double w = 2.0 * std::numbers::pi / 60.0;
            return 5.0 / 60.0 * t * t / 2.0 + 0.5 * (1.0 - std::cos(w * t)) / w;
        };
        s.field = [](double t) {
            return std::complex<double>{faded(t) ? std::pow(10.0, deep_db / 20.0) : 1.0, 0.0};
        };
        return s;
    }
};

struct held {
    double records = 0.0, inside = 0.0;
    void add(const interval_estimate& e, double truth) {
        records += 1.0;
        inside += truth <= e.high95 && !(truth < e.low95) ? 1.0 : 0.0;
    }
    [[nodiscard]] double percent() const { return 100.0 * inside / records; }
};

TEST(CoverageFadingLevels, HoldBeforeBetweenAndBehindFades) {
    held strong_carrier, strong_tone, faded_carrier, faded_tone;
    double limited = 0.0, bias = 0.0;
    for (std::uint64_t seed = 1; seed <= 20; ++seed) {
        const test::am_signal s = fading::signal(seed);
        const level_log log = test::measure(s, fading::seconds, {.every_s = 0.2, .window_s = 0.2});
        const double tone_dbfs = s.carrier_dbfs + 20.0 * std::log10(s.depth);
        for (const level_record& r : log.records) {
            if (fading::changes(r.time_s)) {
                continue;
            }
            if (fading::faded(r.time_s)) {
                faded_carrier.add(r.carrier_dbfs, s.carrier_dbfs + fading::deep_db);
                faded_tone.add(r.tone_dbfs, tone_dbfs + fading::deep_db);
                limited += (r.flags & flag_weak_carrier) != 0 ? 1.0 : 0.0;
            } else {
                strong_carrier.add(r.carrier_dbfs, s.carrier_dbfs);
                strong_tone.add(r.tone_dbfs, tone_dbfs);
                bias += r.carrier_dbfs.value - s.carrier_dbfs;
            }
        }
    }
    EXPECT_GE(strong_carrier.percent(), allowed("coverage_percent.low"));
    EXPECT_GE(strong_tone.percent(), allowed("coverage_percent.low"));
    EXPECT_GE(faded_carrier.percent(), allowed("coverage_percent.floor_low"));
    EXPECT_GE(faded_tone.percent(), allowed("coverage_percent.floor_low"));
    EXPECT_GE(limited / faded_carrier.records,
              0.99); // false alarm 0.001 a record
    EXPECT_NEAR(bias / strong_carrier.records, 0.0, 0.01);
    RecordProperty("strong", std::to_string(strong_carrier.percent()) + " " +
                                 std::to_string(strong_tone.percent()));
    RecordProperty("faded", std::to_string(faded_carrier.percent()) + " " +
                                std::to_string(faded_tone.percent()));
}

} // namespace
} // namespace tonewalk
