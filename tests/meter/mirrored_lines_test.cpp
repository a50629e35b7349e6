// SPDX-License-Identifier: GPL-3.0-or-later
#include "../../src/meter/mirrored_lines.hpp"

#include <complex>
#include <numbers>
#include <vector>

#include <gtest/gtest.h>

namespace tonewalk {
namespace {

constexpr double rate_hz = 8e3;
constexpr std::size_t samples = 1627; // no whole number of runs
constexpr std::array<double, 3> off_hz{512.3, 1024.6, 768.45};

cf64 line(double hz, cf64 amplitude, double t) {
    return amplitude * std::polar(1.0, 2.0 * std::numbers::pi * hz * t);
}

mirrored_lines::reading read(double carrier_hz, double read_at_hz) {
    std::vector<cf32> record(samples);
    for (std::size_t n = 0; n < samples; ++n) {
        const double t = (static_cast<double>(n) - static_cast<double>(samples) / 2.0) / rate_hz;
        record[n] =
            cf32{line(carrier_hz, {0.5, 0.2}, t) + line(carrier_hz + off_hz[0], {0.1, -0.05}, t) +
                 line(carrier_hz - off_hz[0], {-0.07, 0.02}, t) +
                 line(carrier_hz + off_hz[1], {0.01, 0.02}, t)};
    }
    sample_runs weighted{samples};
    weighted.set(record, hann_weights(samples));
    return mirrored_lines{rate_hz, samples, off_hz}.read(weighted, read_at_hz);
}

void expect_near(cf64 value, cf64 truth, double allowed) {
    EXPECT_LT(std::abs(value - truth), allowed) << value << " for " << truth;
}

TEST(MirroredLines, ReadAmplitudeAndPhaseAtTheCentre) {
    constexpr double leakage = 2e-6; // of a Hann window, some 100 bins off
    const mirrored_lines::reading r = read(37.2, 37.2);
    expect_near(r.carrier, {0.5, 0.2}, leakage);
    expect_near(r.sides[0].upper, {0.1, -0.05}, leakage);
    expect_near(r.sides[0].lower, {-0.07, 0.02}, leakage);
    expect_near(r.sides[1].upper, {0.01, 0.02}, leakage);
    expect_near(r.sides[1].lower, {}, leakage);
    expect_near(r.sides[2].upper, {}, leakage);
    expect_near(r.sides[2].lower, {}, leakage);
}

// Off the carrier all lines droop by one factor: ratios stay.
TEST(MirroredLines, TellHowFarTheCarrierIsOff) {
    for (const double off : {-2.0, -0.3, 0.0, 1.0}) {
        const mirrored_lines::reading r = read(37.2, 37.2 - off);
        EXPECT_NEAR(r.offset_hz, off, 0.01 + 0.03 * std::abs(off));
        expect_near(r.sides[0].upper / r.carrier, cf64{0.1, -0.05} / cf64{0.5, 0.2}, 1e-4);
        expect_near(r.sides[1].upper / r.carrier, cf64{0.01, 0.02} / cf64{0.5, 0.2}, 1e-4);
    }
}

} // namespace
} // namespace tonewalk
