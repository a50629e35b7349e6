// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/maths/least_squares.hpp"

#include <cmath>

#include <gtest/gtest.h>

#include "tonewalk/base/random.hpp"

namespace tonewalk {

// Closed form of a straight line's weighted fit: with weights w, S = sum w, and centred sums,
// slope = sum w (x - X)(y - Y) / sum w (x - X)^2, variances 1 / sum w (x - X)^2 and 1 / S at X.
TEST(LeastSquares, FitsAStraightLineLikeItsClosedForm) {
    const std::vector<double> x{0.0, 1.0, 2.5, 4.0, 7.0}, y{1.0, 2.7, 6.2, 8.8, 15.4},
        sigmas{0.1, 0.3, 0.1, 0.2, 0.5};
    double s = 0, sx = 0, sy = 0, sxx = 0, sxy = 0;
    std::vector<double> design;
    for (std::size_t k = 0; k < x.size(); ++k) {
        const double w = 1.0 / (sigmas[k] * sigmas[k]);
        s += w;
        sx += w * x[k];
        sy += w * y[k];
        sxx += w * x[k] * x[k];
        sxy += w * x[k] * y[k];
        design.insert(design.end(), {1.0, x[k]});
    }
    const double determinant = s * sxx - sx * sx;
    const auto fit = fit_linear(design, y, sigmas);
    ASSERT_TRUE(fit);
    EXPECT_NEAR(fit->coefficients[1], (s * sxy - sx * sy) / determinant, 1e-12);
    EXPECT_NEAR(fit->coefficients[0], (sxx * sy - sx * sxy) / determinant, 1e-12);
    EXPECT_NEAR(fit->covariance_of(0, 0), sxx / determinant, 1e-12);
    EXPECT_NEAR(fit->covariance_of(1, 1), s / determinant, 1e-12);
    EXPECT_NEAR(fit->covariance_of(0, 1), -sx / determinant, 1e-12);
    EXPECT_NEAR(fit->sigma_of(1), std::sqrt(s / determinant), 1e-12);
    EXPECT_EQ(fit->degrees, 3U);
}

TEST(LeastSquares, BearsColumnsOfVeryDifferentSize) {
    std::vector<double> design, y;
    for (int k = 0; k < 20; ++k) {
        const double x = k * 1e6;
        design.insert(design.end(), {1e-9, x, x * x});
        y.push_back(3.0 + 2e-6 * x - 5e-13 * x * x);
    }
    const auto fit = fit_linear(design, y);
    ASSERT_TRUE(fit);
    EXPECT_NEAR(fit->coefficients[0], 3e9, 1e-9 * 3e9);
    EXPECT_NEAR(fit->coefficients[1], 2e-6, 1e-15);
    EXPECT_NEAR(fit->coefficients[2], -5e-13, 1e-22);
    EXPECT_LT(fit->chi_square, 1e-20);
}

TEST(LeastSquares, GivesNothingWhereColumnsDependOnEachOther) {
    EXPECT_FALSE(fit_linear(std::vector{1.0, 2.0, 2.0, 4.0, 3.0, 6.0}, std::vector{1.0, 2.0, 3.0}));
    EXPECT_FALSE(fit_linear(std::vector{1.0, 2.0}, std::vector{1.0}));
    EXPECT_FALSE(fit_linear(std::vector{1.0, 0.0, 1.0, 0.0}, std::vector{1.0, 2.0}));
}

// The scatter over 2000 seeds is what the covariance says, and chi-square averages to its degrees
// of freedom: within four standard errors (1/sqrt(2 n) of a sigma, sqrt(2 d/n) of a chi-square).
TEST(LeastSquares, CovarianceIsTheScatterOverSeeds) {
    constexpr int seeds = 2000;
    constexpr std::size_t points = 12;
    double square = 0.0, chi = 0.0, expected = 0.0;
    for (int seed = 0; seed < seeds; ++seed) {
        random_stream random{static_cast<std::uint64_t>(seed)};
        std::vector<double> design, y, sigmas;
        for (std::size_t k = 0; k < points; ++k) {
            const double x = static_cast<double>(k) / 5.0, sigma = 0.1 + 0.1 * x;
            design.insert(design.end(), {1.0, x, x * x});
            y.push_back(1.0 - x + 0.5 * x * x + sigma * random.gaussian());
            sigmas.push_back(sigma);
        }
        const auto fit = fit_linear(design, y, sigmas);
        ASSERT_TRUE(fit);
        square += (fit->coefficients[2] - 0.5) * (fit->coefficients[2] - 0.5);
        chi += fit->chi_square;
        expected = fit->sigma_of(2);
    }
    EXPECT_NEAR(std::sqrt(square / seeds), expected, 4.0 / std::sqrt(2.0 * seeds) * expected);
    EXPECT_NEAR(chi / seeds, 9.0, 4.0 * std::sqrt(18.0 / seeds));
}

} // namespace tonewalk
