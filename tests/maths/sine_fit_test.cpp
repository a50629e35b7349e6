// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/maths/sine_fit.hpp"

#include <cmath>
#include <numbers>

#include <gtest/gtest.h>

#include "tonewalk/base/random.hpp"
#include "tonewalk/maths/cramer_rao.hpp"
#include "tonewalk/maths/window.hpp"

namespace tonewalk {
namespace {

constexpr double two_pi = 2.0 * std::numbers::pi, rate_hz = 48e3;

struct sine {
    double hz, amplitude, phase_rad;
};

std::vector<double> wave(std::size_t count, double offset, const std::vector<sine>& sines,
                         double noise_sigma = 0.0, std::uint64_t seed = 1) {
    random_stream random{seed};
    std::vector<double> y(count, offset);
    for (std::size_t n = 0; n < count; ++n) {
        for (const sine& s : sines) {
            y[n] += s.amplitude *
                    std::cos(two_pi * s.hz * static_cast<double>(n) / rate_hz + s.phase_rad);
        }
        y[n] += noise_sigma * random.gaussian();
    }
    return y;
}

std::vector<double> blackman_harris(std::size_t size) {
    const window w = blackman_harris_window(size);
    return {w.values().begin(), w.values().end()};
}

void expect_sine(const fitted_sine& found, const sine& truth, double tolerance) {
    EXPECT_NEAR(found.frequency_hz, truth.hz, tolerance * rate_hz);
    EXPECT_NEAR(found.amplitude, truth.amplitude, tolerance);
    EXPECT_NEAR(found.phase_rad, truth.phase_rad, tolerance / truth.amplitude * 100.0);
}

} // namespace

TEST(SineFit, SeparatesSinesOfKnownFrequencyExactly) {
    const std::vector<sine> truth{{90.0, 0.2, 0.4}, {150.0, 0.18, -2.0}, {1020.3, 0.05, 3.0}};
    const auto y = wave(4801, 1.0, truth);
    const auto fit = fit_sines(y, {.rate_hz = rate_hz, .frequencies_hz = {90.0, 150.0, 1020.3}});
    ASSERT_TRUE(fit);
    EXPECT_NEAR(fit->offset, 1.0, 1e-12);
    for (std::size_t k = 0; k < truth.size(); ++k) {
        expect_sine(fit->sines[k], truth[k], 1e-12);
        EXPECT_EQ(fit->sines[k].frequency_sigma_hz, 0.0);
    }
    EXPECT_LT(fit->residual_rms, 1e-7);
}

TEST(SineFit, RefinesUnknownFrequencies) {
    const std::vector<sine> truth{{997.13, 0.8, 1.1}, {1994.26, 0.02, -0.3}, {333.7, 0.1, 2.2}};
    const auto y = wave(9600, -0.2, truth);
    const auto fit = fit_sines(
        y,
        {.rate_hz = rate_hz, .frequencies_hz = {998.5, 1992.8, 335.0}, .refine_frequencies = true});
    ASSERT_TRUE(fit);
    for (std::size_t k = 0; k < truth.size(); ++k) {
        expect_sine(fit->sines[k], truth[k], 1e-10);
    }
}

// At 20 dB in 4800 samples the scatter over 500 seeds is the bound's and the sigmas' (DSP-4),
// within four standard errors (1 / sqrt(2 n), 13 %).
TEST(SineFit, ScattersByTheCramerRaoBoundAndSaysSo) {
    constexpr int seeds = 500;
    const tone_bound bound = real_tone_bound(100.0, 4800, rate_hz);
    const double noise_sigma = std::sqrt(0.5 / 100.0);
    double frequency_squares = 0.0, amplitude_squares = 0.0;
    double frequency_sigma = 0.0, amplitude_sigma = 0.0;
    for (int seed = 0; seed < seeds; ++seed) {
        const auto y =
            wave(4800, 0.0, {{1234.5, 1.0, 0.7}}, noise_sigma, static_cast<std::uint64_t>(seed));
        const auto fit = fit_sines(
            y, {.rate_hz = rate_hz, .frequencies_hz = {1234.0}, .refine_frequencies = true});
        ASSERT_TRUE(fit);
        frequency_squares += std::pow(fit->sines[0].frequency_hz - 1234.5, 2.0) / seeds;
        amplitude_squares += std::pow(fit->sines[0].amplitude - 1.0, 2.0) / seeds;
        frequency_sigma += fit->sines[0].frequency_sigma_hz / seeds;
        amplitude_sigma += fit->sines[0].amplitude_sigma / seeds;
        EXPECT_NEAR(fit->residual_rms, noise_sigma, 0.06 * noise_sigma);
    }
    EXPECT_NEAR(std::sqrt(frequency_squares), bound.frequency_hz, 0.13 * bound.frequency_hz);
    EXPECT_NEAR(std::sqrt(amplitude_squares), bound.relative_amplitude,
                0.13 * bound.relative_amplitude);
    EXPECT_NEAR(frequency_sigma, bound.frequency_hz, 0.02 * bound.frequency_hz);
    EXPECT_NEAR(amplitude_sigma, bound.relative_amplitude, 0.02 * bound.relative_amplitude);
}

// Voice beside two tones: an unfitted line spoils a plain fit, a window keeps it away.
TEST(SineFit, AWindowKeepsUnfittedLinesAway) {
    const std::vector<sine> all{{90.0, 0.2, 0.1}, {150.0, 0.2, 1.0}, {713.77, 0.3, 0.4}};
    const auto y = wave(48000, 1.0, all);
    const auto weights = blackman_harris(y.size());
    const sine_fit_request plain{.rate_hz = rate_hz, .frequencies_hz = {90.0, 150.0}};
    sine_fit_request weighted = plain;
    weighted.weights = weights;
    const auto difference = [](const sine_fit& f) {
        return f.sines[0].amplitude - f.sines[1].amplitude;
    };
    const auto bare = fit_sines(y, plain), windowed = fit_sines(y, weighted);
    ASSERT_TRUE(bare && windowed);
    EXPECT_GT(std::abs(difference(*bare)), 1e-5);
    EXPECT_LT(std::abs(difference(*windowed)), 1e-7);
}

// A window spends information: with white noise the sigma grows by the root of its noise bandwidth.
TEST(SineFit, WeightedSigmaIsTheScatter) {
    constexpr int seeds = 400;
    const auto weights = blackman_harris(4800);
    double squares = 0.0, sigma = 0.0;
    for (int seed = 0; seed < seeds; ++seed) {
        const auto y = wave(4800, 0.0, {{1000.0, 1.0, 0.0}}, 0.1, static_cast<std::uint64_t>(seed));
        const auto fit =
            fit_sines(y, {.rate_hz = rate_hz, .frequencies_hz = {1000.0}, .weights = weights});
        ASSERT_TRUE(fit);
        squares += std::pow(fit->sines[0].amplitude - 1.0, 2.0) / seeds;
        sigma += fit->sines[0].amplitude_sigma / seeds;
    }
    const double truth =
        0.1 * std::sqrt(2.0 / 4800.0 * blackman_harris_window(4800).noise_bandwidth_bins());
    EXPECT_NEAR(std::sqrt(squares), truth, 0.15 * truth);
    EXPECT_NEAR(sigma, truth, 0.02 * truth);
}

TEST(SineFit, GivesNothingWhereSinesCannotBeToldApart) {
    const auto y = wave(480, 0.0, {{1000.0, 1.0, 0.0}});
    EXPECT_FALSE(fit_sines(y, {.rate_hz = rate_hz, .frequencies_hz = {1000.0, 1000.0}}));
    EXPECT_FALSE(fit_sines(std::span{y}.first(2), {.rate_hz = rate_hz, .frequencies_hz = {1e3}}));
}

} // namespace tonewalk
