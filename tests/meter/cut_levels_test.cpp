// SPDX-License-Identifier: GPL-3.0-or-later
#include <cstring>

#include <gtest/gtest.h>

#include "support/am_source.hpp"

namespace tonewalk {
namespace {

/// Every number of every record, in bits, so that NaN equals itself.
std::vector<std::uint64_t> bits_of(const level_log& log) {
    std::vector<std::uint64_t> bits;
    const auto add = [&bits](double x) {
        std::uint64_t b = 0;
        std::memcpy(&b, &x, sizeof b);
        bits.push_back(b);
    };
    const auto add_level = [&add](const interval_estimate& e) {
        for (const double x : {e.value, e.low95, e.high95, e.u95}) {
            add(x);
        }
    };
    for (const level_record& r : log.records) {
        for (const double x : {r.time_s, r.carrier.power, r.carrier.sigma, r.tone.power,
                               r.tone.sigma, r.noise_power, r.tone_snr_db, r.carrier_offset_hz}) {
            add(x);
        }
        add_level(r.carrier_dbfs);
        add_level(r.tone_dbfs);
        add_level(r.depth_percent);
        bits.push_back(r.flags);
        bits.push_back(r.stretch);
    }
    for (const double x : {log.tone_hz, log.carrier_offset_hz}) {
        add(x);
    }
    for (const std::vector<double>* each : {&log.strip.x, &log.strip.y, &log.strip.z}) {
        for (const double x : *each) {
            add(x);
        }
    }
    return bits;
}

void expect_alike(const test::am_signal& s, const test::meter_options& given) {
    const std::vector<cf32> samples = test::generate(s, 12.0);
    std::vector<std::uint64_t> first;
    for (const std::size_t cut :
         {samples.size(), std::size_t{1}, std::size_t{7}, std::size_t{4093}}) {
        line_meter meter{test::meter_config(s, given)};
        test::feed(meter, samples, cut);
        const std::vector<std::uint64_t> bits = bits_of(meter.take_result());
        if (first.empty()) {
            first = bits;
            ASSERT_GT(first.size(), 1000U);
        } else {
            EXPECT_EQ(bits, first) << "runs of " << cut;
        }
    }
}

TEST(LineMeterCuts, AnyCutOfTheSamplesGivesTheSameBits) {
    test::am_signal s;
    s.rate_hz = 4.1e3;
    s.tone_hz = 251.0;
    s.offset_hz = 0.3;
    s.noise_density = 1e-7;
    expect_alike(s, {});
    s.noise_density = 1e-3; // no record is strong: the opening's frequency is held
    expect_alike(s, {});
    s.noise_density = 1e-6; // few lines: the neighbours' noise joins
    expect_alike(s, {.every_s = 0.05, .window_s = 0.05, .width_hz = 900.0});
}

/// The stretches of one recording, each cut anew.
TEST(LineMeterCuts, GapsAndMissingSamplesToo) {
    test::am_signal s;
    s.rate_hz = 4.1e3;
    s.tone_hz = 251.0;
    s.noise_density = 1e-7;
    const std::vector<cf32> samples = test::generate(s, 5.0);
    const std::vector<sample_range> zeroed{{4000, 30}};
    std::vector<std::uint64_t> first;
    for (const std::size_t cut : {samples.size(), std::size_t{7}, std::size_t{4093}}) {
        line_meter meter{test::meter_config(s, {})};
        for (const std::uint32_t stretch : {0U, 1U}) {
            meter.begin_stretch({.index = stretch, .start_s = 30.0 * stretch});
            for (std::size_t at = 0; at < samples.size(); at += cut) {
                const std::size_t count = std::min(cut, samples.size() - at);
                const bool touches = at < 4030 && at + count > 4000;
                meter.add({std::span{samples}.subspan(at, count), static_cast<sample_index>(at),
                           touches ? std::span{zeroed} : std::span<const sample_range>{}});
            }
            meter.end_stretch();
        }
        meter.finish();
        const level_log log = meter.take_result();
        std::size_t nulls = 0;
        for (const level_record& r : log.records) {
            nulls += (r.flags & flag_non_finite) != 0 ? 1U : 0U;
            EXPECT_EQ(std::isnan(r.carrier_dbfs.high95), (r.flags & flag_non_finite) != 0);
        }
        EXPECT_EQ(nulls, 4U); // two of each stretch
        const std::vector<std::uint64_t> bits = bits_of(log);
        if (first.empty()) {
            first = bits;
        }
        EXPECT_EQ(bits, first) << "runs of " << cut;
    }
}

/// Between records far apart most samples are needless; each record still
/// stands where it says.
TEST(LineMeterCuts, RecordsFarApartStandAtTheirTimes) {
    test::am_signal s;
    s.rate_hz = 4.1e3;
    s.tone_hz = 251.0;
    s.field = [](double t) { return std::complex<double>{std::pow(10.0, -t / 20.0), 0.0}; };
    const std::vector<cf32> samples = test::generate(s, 12.0); // falling by 1 dB a second
    for (const std::size_t cut : {samples.size(), std::size_t{7}, std::size_t{4093}}) {
        line_meter meter{test::meter_config(s, {.every_s = 1.0, .window_s = 0.1})};
        test::feed(meter, samples, cut);
        const level_log log = meter.take_result();
        ASSERT_EQ(log.records.size(), 12U);
        for (const level_record& r : log.records) {
            EXPECT_NEAR(r.carrier_dbfs.value, s.carrier_dbfs - r.time_s, 0.01) << "runs of " << cut;
        }
    }
}

} // namespace
} // namespace tonewalk
