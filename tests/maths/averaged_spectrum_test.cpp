// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/maths/averaged_spectrum.hpp"

#include <complex>
#include <numbers>
#include <numeric>

#include <gtest/gtest.h>

#include "tonewalk/base/random.hpp"

namespace tonewalk {
namespace {

constexpr double two_pi = 2.0 * std::numbers::pi;

std::vector<cf32> noise(std::size_t count, double power, std::uint64_t seed) {
    random_stream random{seed};
    std::vector<cf32> samples(count);
    const double each = std::sqrt(power / 2.0);
    for (cf32& z : samples) {
        const double re = random.gaussian(), im = random.gaussian();
        z = cf32{cf64{each * re, each * im}};
    }
    return samples;
}

} // namespace

TEST(AveragedSpectrum, ALineReadsItsSquaredAmplitudeAtItsOwnFrequency) {
    for (const std::size_t size : {64U, 81U}) {
        for (const int bin : {-20, -1, 0, 5, 31}) {
            averaged_spectrum spectrum{blackman_harris_window(size)};
            std::vector<cf32> line(10 * size); // half overlapping: 19 segments
            for (std::size_t n = 0; n < line.size(); ++n) {
                line[n] = cf32{std::polar(0.25, two_pi * bin * static_cast<double>(n) /
                                                    static_cast<double>(size))};
            }
            spectrum.add(line);
            const auto place = static_cast<std::size_t>(static_cast<int>(size / 2) + bin);
            EXPECT_NEAR(spectrum.powers()[place], 0.0625, 1e-6) << size << ' ' << bin;
            EXPECT_EQ(spectrum.segments(), 19U);
        }
    }
}

// White noise of density N0 reads N0 x noise bandwidth in every bin. Scatter of a mean over 200
// segments and 128 bins: below 1 %.
TEST(AveragedSpectrum, WhiteNoiseReadsItsDensityTimesTheNoiseBandwidth) {
    const window hann = hann_window(128);
    averaged_spectrum spectrum{hann};
    spectrum.add(noise(128 * 200, 2.0, 3));
    const std::vector<double> powers = spectrum.powers();
    const double mean = std::accumulate(powers.begin(), powers.end(), 0.0) / 128.0;
    EXPECT_NEAR(mean, 2.0 / 128.0 * hann.noise_bandwidth_bins(), 0.03 * mean);
}

TEST(AveragedSpectrum, SplittingTheStreamChangesNothing) {
    const std::vector<cf32> samples = noise(5000, 1.0, 9);
    averaged_spectrum whole{hann_window(256)}, split{hann_window(256)};
    whole.add(samples);
    for (std::size_t first = 0, step = 1; first < samples.size();
         first += step, step = step * 2 % 1021) {
        split.add(std::span{samples}.subspan(first, std::min(step, samples.size() - first)));
    }
    EXPECT_EQ(whole.powers(), split.powers());
}

TEST(AveragedSpectrum, IsEmptyUntilAWindowIsFull) {
    averaged_spectrum spectrum{hann_window(256)};
    spectrum.add(noise(255, 1.0, 1));
    EXPECT_EQ(spectrum.segments(), 0U);
    EXPECT_EQ(spectrum.powers(), std::vector<double>(256, 0.0));
}

} // namespace tonewalk
