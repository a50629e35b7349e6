// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/reading/extrema.hpp"

#include <algorithm>
#include <cmath>
#include <numbers>

#include <gtest/gtest.h>

#include "support/am_source.hpp"
#include "support/wrong_meters.hpp"
#include "tonewalk/base/allowed_errors.hpp"

namespace tonewalk {
namespace {

using test::am_signal;
using test::measure;

constexpr double two_pi = 2.0 * std::numbers::pi;

/// Two waves against each other, seen from a point that moves one wavelength in `wavelength_s`; the
/// sum of their amplitudes is 1. Truth never comes from the formula of the standing wave.
struct two_waves {
    double swr = 10.0, wavelength_s = 25.0, phase = 0.4;
    [[nodiscard]] double forward() const { return (swr + 1.0) / (2.0 * swr); }
    [[nodiscard]] double backward() const { return (swr - 1.0) / (2.0 * swr); }
    [[nodiscard]] std::complex<double> operator()(double t) const {
        const double turn = two_pi * t / wavelength_s;
        return std::polar(forward(), -turn) + std::polar(backward(), turn + phase);
    }
    /// Times of the nulls: the two waves opposite.
    [[nodiscard]] std::vector<double> nulls(double from_s, double until_s) const {
        std::vector<double> times;
        const double spacing_s = wavelength_s / 2.0;
        for (double t = (std::numbers::pi - phase) / (2.0 * two_pi) * wavelength_s; t < until_s;
             t += spacing_s) {
            if (t > from_s) {
                times.push_back(t);
            }
        }
        return times;
    }
};

/// Every null that stands a quarter wavelength from either end is found once, and every one found
/// is true.
void expect_each_once(const std::vector<extremum>& found, const two_waves& waves, double seconds,
                      double tolerance_s) {
    const double margin_s = waves.wavelength_s / 4.0;
    for (const double truth : waves.nulls(margin_s, seconds - margin_s)) {
        EXPECT_EQ(std::count_if(
                      found.begin(), found.end(),
                      [&](const extremum& e) { return std::abs(e.time_s - truth) < tolerance_s; }),
                  1)
            << "null at " << truth;
    }
    for (const extremum& e : found) {
        double nearest_s = 1e9;
        for (const double truth : waves.nulls(0.0, seconds)) {
            nearest_s = std::min(nearest_s, std::abs(e.time_s - truth));
        }
        EXPECT_LT(nearest_s, tolerance_s) << "invented at " << e.time_s;
    }
}

am_signal walk_through(const two_waves& waves, double null_snr_db, double window_s,
                       std::uint64_t seed) {
    random_stream random{seed};
    am_signal s;
    s.rate_hz = random.uniform(11e3, 13e3);
    s.tone_hz = random.uniform(500.0, 900.0);
    s.depth = random.uniform(0.5, 0.9);
    s.offset_hz = random.uniform(-0.3, 0.3);
    s.phase = random.uniform(0.0, two_pi);
    s.carrier_dbfs = -10.0;
    s.field = waves;
    s.seed = seed;
    // Carrier amplitude at a null is 1/swr of the peak's; line noise is 1.5 N0/T.
    const double null_power = std::pow(10.0, s.carrier_dbfs / 10.0) / (waves.swr * waves.swr);
    s.noise_density = null_power * std::pow(10.0, -null_snr_db / 10.0) * window_s / 1.5;
    return s;
}

std::vector<extremum> of_kind(const extrema_result& r, extremum_kind kind) {
    std::vector<extremum> found;
    std::copy_if(r.found.begin(), r.found.end(), std::back_inserter(found),
                 [kind](const extremum& e) { return e.kind == kind; });
    return found;
}

// Table of allowed errors, "null depth": SWR 10 and 30, null SNR 15 dB and more.
TEST(CoverageNullDepth, HoldsForWindowsThatANullFillsSixTimes) {
    for (const double swr : {10.0, 30.0}) {
        double bias = 0.0, count = 0.0, inside = 0.0;
        for (std::uint64_t seed = 1; seed <= 8; ++seed) {
            const double window_s = 0.1;
            const two_waves waves{swr, window_s * (swr > 20.0 ? 400.0 : 130.0),
                                  0.3 * static_cast<double>(seed)};
            const double seconds = 1.6 * waves.wavelength_s;
            const am_signal s = walk_through(waves, 20.0, window_s, seed);
            const level_log log =
                measure(s, seconds, {.every_s = window_s / 2.0, .window_s = window_s});
            const auto nulls = of_kind(find_extrema(log, quantity::carrier), extremum_kind::null);
            expect_each_once(nulls, waves, seconds, 0.02 * waves.wavelength_s);
            const double truth_dbfs = s.carrier_dbfs - 20.0 * std::log10(swr);
            for (const extremum& e : nulls) {
                EXPECT_FALSE(e.window_bound) << "swr " << swr << " seed " << seed;
                bias += e.level_dbfs.value - truth_dbfs;
                count += 1.0;
                inside += e.level_dbfs.low95 <= truth_dbfs && truth_dbfs <= e.level_dbfs.high95
                              ? 1.0
                              : 0.0;
            }
        }
        ASSERT_GT(count, 15.0);
        EXPECT_NEAR(bias / count, 0.0, allowed("null_bias_db")) << "swr " << swr;
        EXPECT_GE(inside / count, 0.8) << "swr " << swr;
        RecordProperty("null_bias_db_swr_" + std::to_string(static_cast<int>(swr)),
                       std::to_string(bias / count));
    }
}

// Without noise only the window's own smear is left, and the interval holds it.
TEST(NullDepth, IntervalHoldsTheWindowsSmear) {
    for (const double swr : {3.0, 8.0, 20.0}) {
        const two_waves waves{swr, 0.2 * (swr > 10.0 ? 250.0 : 90.0), 0.9};
        const am_signal s = walk_through(waves, 80.0, 0.2, 21);
        const level_log log = measure(s, 1.2 * waves.wavelength_s, {});
        for (const extremum& e : find_extrema(log, quantity::carrier).found) {
            const double truth_dbfs =
                s.carrier_dbfs - (e.kind == extremum_kind::null ? 20.0 * std::log10(swr) : 0.0);
            EXPECT_FALSE(e.floor_limited);
            EXPECT_LE(e.level_dbfs.low95, truth_dbfs) << swr << " read " << e.level_dbfs.value;
            EXPECT_GE(e.level_dbfs.high95, truth_dbfs) << swr;
            EXPECT_LT(e.level_dbfs.high95 - e.level_dbfs.low95, swr < 5.0 ? 0.6 : 0.15) << swr;
        }
    }
}

// A window that a null does not fill six times fills the null: said, and given as a bound that
// holds.
TEST(NullDepth, IsABoundWhereTheWindowFillsTheNull) {
    const double window_s = 0.2;
    const two_waves waves{30.0, 32.0 * window_s, 0.9};
    const am_signal s = walk_through(waves, 20.0, window_s, 5);
    const level_log log = measure(s, 40.0, {.every_s = 0.05, .window_s = window_s});
    const extrema_result result = find_extrema(log, quantity::carrier);
    EXPECT_TRUE(result.doubts.has(note_code::window_bound));
    const auto nulls = of_kind(result, extremum_kind::null);
    expect_each_once(nulls, waves, 40.0, 0.1);
    for (const extremum& e : nulls) {
        EXPECT_TRUE(e.window_bound);
        EXPECT_TRUE(e.floor_limited);
        EXPECT_TRUE(std::isnan(e.level_dbfs.value));
        EXPECT_GE(e.level_dbfs.high95, s.carrier_dbfs - 20.0 * std::log10(30.0));
    }
}

/// How long the field stays within 6 dB of its least value, from the waves themselves.
double null_width_s(const two_waves& waves) {
    const double middle = waves.nulls(0.0, waves.wavelength_s).front();
    const double limit = std::pow(10.0, 6.0 / 20.0) * std::abs(waves(middle));
    double half_s = 0.0;
    while (std::abs(waves(middle + half_s)) < limit) {
        half_s += 1e-5 * waves.wavelength_s;
    }
    return 2.0 * half_s;
}

TEST(NullDepth, AdvisesTheWindowThatTheNullsDemand) {
    for (const double swr : {8.0, 30.0}) {
        const two_waves waves{swr, 6.4, 0.9};
        const double demanded_s = null_width_s(waves) / 6.0;
        const am_signal s = walk_through(waves, 40.0, 0.2, 5);
        const auto result_with = [&](double window_s) {
            const level_log log =
                measure(s, 40.0, {.every_s = window_s / 4.0, .window_s = window_s});
            return find_extrema(log, quantity::carrier);
        };
        const extrema_result filled = result_with(0.2);
        ASSERT_EQ(filled.doubts.all().size(), 1U);
        const std::string advice = filled.doubts.all().front().advice;
        const double advised_s = std::stod(advice.substr(advice.find("--window ") + 9)) / 1000.0;
        EXPECT_LT(advised_s, 1.1 * demanded_s) << swr;
        EXPECT_GT(advised_s, 0.75 * demanded_s) << swr;
        EXPECT_FALSE(result_with(0.9 * advised_s).doubts.has(note_code::window_bound)) << swr;
    }
}

TEST(Nulls, AreEachFoundOnceFromSwrTwoToFullyCrossed) {
    for (const double swr : {2.0, 10.0, 30.0, 1e9}) {
        const two_waves waves{swr, 12.0, 1.1};
        const am_signal s =
            walk_through({std::min(swr, 60.0), 12.0, 1.1}, swr < 5.0 ? 30.0 : 12.0, 0.2, 11);
        am_signal fed = s;
        fed.field = waves;
        const level_log log = measure(fed, 60.0, {.every_s = 0.1, .window_s = 0.2});
        for (const quantity which : {quantity::carrier, quantity::tone}) {
            const extrema_result result = find_extrema(log, which);
            const auto nulls = of_kind(result, extremum_kind::null);
            expect_each_once(nulls, waves, 60.0, 0.15);
            for (const extremum& e : nulls) {
                EXPECT_EQ(e.floor_limited, swr > 5.0) << "swr " << swr;
            }
            // A quarter wavelength between a peak and the next null (common practice, no source).
            const auto peaks = of_kind(result, extremum_kind::peak);
            ASSERT_GE(peaks.size(), nulls.size() - 1);
        }
    }
}

TEST(CoverageNulls, PlacesLieWithinTheirIntervals) {
    double inside = 0.0, count = 0.0;
    for (std::uint64_t seed = 1; seed <= 40; ++seed) {
        const two_waves waves{4.0, 12.0, 0.15 * static_cast<double>(seed)};
        const am_signal s = walk_through(waves, 18.0, 0.1, seed);
        const level_log log = measure(s, 18.0, {.every_s = 0.05, .window_s = 0.1});
        const auto truth = waves.nulls(0.8, 17.2);
        for (const extremum& e :
             of_kind(find_extrema(log, quantity::carrier), extremum_kind::null)) {
            double nearest = 1e9;
            for (const double t : truth) {
                nearest = std::min(nearest, std::abs(e.time_s - t));
            }
            inside += nearest <= e.time_s_u95 ? 1.0 : 0.0;
            count += 1.0;
        }
    }
    ASSERT_GT(count, 80.0);
    EXPECT_GE(inside / count, 0.90);
    EXPECT_LE(inside / count, 0.995); // and are not padded
}

TEST(CoverageFlatLevels, HaveNoExtremaInThirtySixThousandRecords) {
    for (const double snr_db : {25.0, 6.0, -3.0}) {
        am_signal s;
        s.rate_hz = 4e3;
        s.tone_hz = 317.3;
        s.depth = 0.8;
        const double window_s = 0.04;
        s.noise_density = std::pow(10.0, (s.carrier_dbfs - snr_db) / 10.0) * window_s / 1.5;
        s.seed = 77;
        const level_log log = measure(s, 36000.0 * 0.02 + 0.1,
                                      {.every_s = 0.02, .window_s = window_s, .width_hz = 1000.0});
        ASSERT_GE(log.records.size(), 36000U);
        EXPECT_TRUE(find_extrema(log, quantity::carrier).found.empty()) << snr_db;
        EXPECT_TRUE(find_extrema(log, quantity::tone).found.empty()) << snr_db;
    }
}

// The two wrong meters exceed what is allowed where ours holds.
TEST(WrongMeters, CarriedPhaseReadsAPartialNullTooDeep) {
    const two_waves waves{10.0, 26.0, 0.7};
    am_signal s = walk_through(waves, 60.0, 0.2, 3);
    s.offset_hz = 1.0 / waves.wavelength_s; // the stronger wave stands still for the twin
    const double seconds = 30.0;
    const test::twin_grid grid{s.rate_hz, s.tone_hz, static_cast<std::size_t>(0.2 * s.rate_hz),
                               static_cast<std::size_t>(0.1 * s.rate_hz)};
    const std::vector<double> twin =
        tone_power_with_carried_phase(test::generate(s, seconds), grid);
    const double truth_db = s.carrier_dbfs + 20.0 * std::log10(s.depth) - 20.0;
    const double twin_db = 10.0 * std::log10(*std::min_element(twin.begin(), twin.end()));
    EXPECT_LT(twin_db, truth_db - 5.0);
    const level_log ours = measure(s, seconds, {});
    double least = 1e9;
    for (const level_record& r : ours.records) {
        least = std::min(least, r.tone.power);
    }
    EXPECT_NEAR(10.0 * std::log10(least), truth_db, allowed("null_bias_db"));
}

TEST(WrongMeters, RetuningEachRecordFillsNulls) {
    const double window_s = 0.2;
    const two_waves waves{30.0, 32.0 * window_s, 0.7};
    am_signal s = walk_through(waves, 60.0, window_s, 4);
    s.offset_hz = 0.0;
    const double seconds = 20.0;
    const test::twin_grid grid{s.rate_hz, s.tone_hz, static_cast<std::size_t>(window_s * s.rate_hz),
                               static_cast<std::size_t>(0.02 * s.rate_hz)};
    const std::vector<double> twin = carrier_power_retuned(test::generate(s, seconds), grid);
    const auto swr_of = [](double least, double most) { return std::sqrt(most / least); };
    const double twin_swr = swr_of(*std::min_element(twin.begin(), twin.end()),
                                   *std::max_element(twin.begin(), twin.end()));
    const level_log ours = measure(s, seconds, {.every_s = 0.02, .window_s = window_s});
    double least = 1e9, most = 0.0;
    for (const level_record& r : ours.records) {
        least = std::min(least, r.carrier.power);
        most = std::max(most, r.carrier.power);
    }
    const double ours_swr = swr_of(least, most);
    EXPECT_LT(twin_swr, 30.0 * std::pow(10.0, -2.0 * allowed("null_bias_db") / 20.0));
    EXPECT_NEAR(20.0 * std::log10(ours_swr / 30.0), 0.0, allowed("null_bias_db"));
}

/// The walk's log, and the same with doubts that all its levels share.
extrema_result with_doubts(level_log log, double u95_db, double tone_bound) {
    log.common_u95_db = u95_db;
    log.tone_bound = tone_bound;
    return find_extrema(log, quantity::tone);
}

TEST(ExtremaLevels, HoldWhatAllLevelsLeaveInDoubt) {
    am_signal s;
    s.rate_hz = 4e3;
    s.tone_hz = 503.3;
    s.noise_density = 1e-11;
    s.field = two_waves{.swr = 5.0};
    const level_log log = measure(s, 40.0, {});
    const extrema_result plain = with_doubts(log, 0.0, 0.0), drifted = with_doubts(log, 0.6, 0.0),
                         foreign = with_doubts(log, 0.0, 1e-3);
    ASSERT_GE(plain.found.size(), 3U);
    ASSERT_EQ(drifted.found.size(), plain.found.size());
    const auto amplitude = [](double db) { return std::pow(10.0, db / 20.0); };
    for (std::size_t k = 0; k < plain.found.size(); ++k) {
        const interval_estimate &was = plain.found[k].level_dbfs,
                                &wider = drifted.found[k].level_dbfs,
                                &bounded = foreign.found[k].level_dbfs;
        EXPECT_EQ(wider.value, was.value);
        EXPECT_NEAR(wider.high95 - wider.value, std::hypot(was.high95 - was.value, 0.6), 1e-9);
        EXPECT_NEAR(wider.value - wider.low95, std::hypot(was.value - was.low95, 0.6), 1e-9);
        EXPECT_NEAR(amplitude(bounded.high95), amplitude(was.high95) + 1e-3, 1e-9);
        EXPECT_NEAR(amplitude(bounded.low95), amplitude(was.low95) - 1e-3, 1e-9);
    }
}

TEST(NullDepth, AdvisesAWindowForANullBetweenTwoRecords) {
    am_signal s;
    s.rate_hz = 4e3;
    s.tone_hz = 503.3;
    s.noise_density = 1e-13;
    for (const double phase : {0.1, 0.9, 1.7, 2.5}) {
        s.field = two_waves{.swr = 300.0, .wavelength_s = 8.0, .phase = phase};
        const extrema_result r = find_extrema(measure(s, 12.0, {}), quantity::tone);
        ASSERT_TRUE(r.doubts.has(note_code::window_bound));
        const std::string& advice = r.doubts.all().front().advice;
        EXPECT_EQ(advice.find("nan"), std::string::npos) << advice;
        EXPECT_NE(advice.find("walk more slowly"), std::string::npos) << advice;
    }
}

} // namespace
} // namespace tonewalk
