// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/maths/window.hpp"

#include <algorithm>
#include <cmath>
#include <numbers>
#include <vector>

#include <gtest/gtest.h>

#include "tonewalk/base/decibel.hpp"

namespace tonewalk {
namespace {

constexpr std::size_t size = 2048; // periodic form

double response_db(const window& w, double bins) {
    return decibel::from_amplitude_ratio(std::abs(w.response(bins))).db();
}

/// Full width between the points `down_db` below a line's peak.
double width_bins(const window& w, double down_db) {
    double inside = 0.0, outside = 4.0;
    for (int step = 0; step < 40; ++step) {
        const double middle = 0.5 * (inside + outside);
        (response_db(w, middle) > -down_db ? inside : outside) = middle;
    }
    return 2.0 * inside;
}

double highest_side_lobe_db(const window& w, double main_lobe_bins) {
    double highest = -400.0;
    for (double bins = main_lobe_bins; bins < main_lobe_bins + 12.0; bins += 0.01) {
        highest = std::max(highest, response_db(w, bins));
    }
    return highest;
}

struct figures {
    double coherent_gain, noise_bandwidth_bins, scalloping_db, side_lobe_db, width_3db, width_6db;
};

void expect_figures(const window& w, const figures& truth, double main_lobe_bins) {
    EXPECT_NEAR(w.coherent_gain(), truth.coherent_gain, 5e-6);
    EXPECT_NEAR(w.noise_bandwidth_bins(), truth.noise_bandwidth_bins, 5e-5);
    EXPECT_NEAR(w.scalloping_loss_db(), truth.scalloping_db, 5e-5);
    EXPECT_NEAR(width_bins(w, 3.0103), truth.width_3db, 5e-4);
    EXPECT_NEAR(width_bins(w, 6.0206), truth.width_6db, 5e-4);
    EXPECT_NEAR(highest_side_lobe_db(w, main_lobe_bins), truth.side_lobe_db, 0.01);
}

} // namespace

// WIN-1 to WIN-6: figures recomputed from the closed form of each window, periodic, 2048 points.
TEST(Window, HasTheFiguresOfItsClosedForm) {
    expect_figures(rectangular_window(size), {1.0, 1.0, 3.9224, -13.26, 0.886, 1.207}, 1.0);
    expect_figures(hann_window(size), {0.5, 1.5, 1.4236, -31.47, 1.441, 2.0}, 2.0);
    expect_figures(hamming_window(size), {0.54, 1.3628, 1.7514, -42.68, 1.303, 1.815}, 2.0);
    expect_figures(blackman_window(size), {0.42, 1.7268, 1.0989, -58.11, 1.644, 2.299}, 3.0);
    expect_figures(blackman_harris_window(size), {0.35875, 2.0044, 0.8256, -92.01, 1.899, 2.666},
                   4.0);
    expect_figures(nuttall_window(size), {0.36358, 1.9761, 0.8506, -98.16, 1.872, 2.629}, 4.0);
}

// [Harris1978] F. J. Harris, "On the Use of Windows for Harmonic Analysis with the Discrete Fourier
//   Transform", Proc. IEEE 66(1), pp. 51-83, 1978, Table I, printed to two decimals (from memory;
//   its Hamming scalloping, 1.78, does not recompute and is left out).
TEST(Window, AgreesWithHarris1978TableI) {
    constexpr double half_digit = 0.00501;
    const auto expect = [](const window& w, double bandwidth_bins, double scalloping_db) {
        EXPECT_NEAR(w.noise_bandwidth_bins(), bandwidth_bins, half_digit);
        EXPECT_NEAR(w.scalloping_loss_db(), scalloping_db, half_digit);
    };
    expect(rectangular_window(size), 1.00, 3.92);
    expect(hann_window(size), 1.50, 1.42);
    expect(blackman_window(size), 1.73, 1.10);
    expect(blackman_harris_window(size), 2.00, 0.83);
    EXPECT_NEAR(hamming_window(size).noise_bandwidth_bins(), 1.36, half_digit);
}

// [Nuttall1981] A. H. Nuttall, "Some Windows with Very Good Sidelobe Behavior", IEEE Trans. ASSP
//   29(1), 1981: -98.17 dB for this window (from memory; WIN-6 recomputes -98.16).
TEST(Window, NuttallsSideLobesAreWhereHePrintsThem) {
    EXPECT_NEAR(highest_side_lobe_db(nuttall_window(size), 4.0), -98.17, 0.015);
}

// WIN-20: of two Hann-windowed transforms, 50 % and 75 % overlapping, 1/6 and 0.659155 (Harris 16.7
// and 65.9 %, from memory, recomputed).
TEST(Window, HannTransformsThatOverlapCorrelateAsHarrisSays) {
    const window hann = hann_window(size);
    const auto overlap = [&](std::size_t shift) {
        double product = 0.0, square = 0.0;
        for (std::size_t n = 0; n < size; ++n) {
            square += hann.values()[n] * hann.values()[n];
            product += n + shift < size ? hann.values()[n] * hann.values()[n + shift] : 0.0;
        }
        return product / square;
    };
    EXPECT_NEAR(overlap(size / 2), 0.166667, 5e-7);
    EXPECT_NEAR(overlap(size / 4), 0.659155, 5e-7);
}

// Closed form: the transform of a Hann window squared is 3/8, 1/4, 1/16, 0 at 0, 1, 2, 3 bins.
TEST(Window, HannNoiseIsCorrelatedOverTwoBins) {
    const window hann = hann_window(64);
    EXPECT_NEAR(hann.power_correlation(0.0), 1.0, 1e-12);
    EXPECT_NEAR(hann.power_correlation(1.0), 4.0 / 9.0, 1e-12);
    EXPECT_NEAR(hann.power_correlation(2.0), 1.0 / 36.0, 1e-12);
    EXPECT_NEAR(hann.power_correlation(3.0), 0.0, 1e-12);
}

TEST(Window, FollowsItsCosineSumAtEvenAndOddSizes) {
    const std::vector<double> a{0.35875, 0.48829, 0.14128, 0.01168};
    for (const std::size_t n_samples : {1U, 2U, 7U, 100U, 101U}) {
        const window w = blackman_harris_window(n_samples);
        for (std::size_t n = 0; n < n_samples; ++n) {
            const double x =
                2.0 * std::numbers::pi * static_cast<double>(n) / static_cast<double>(n_samples);
            const double truth =
                a[0] - a[1] * std::cos(x) + a[2] * std::cos(2.0 * x) - a[3] * std::cos(3.0 * x);
            EXPECT_NEAR(w.values()[n], truth, 2e-15) << n << " of " << n_samples;
        }
    }
}

} // namespace tonewalk
