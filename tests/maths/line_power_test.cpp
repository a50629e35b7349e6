// SPDX-License-Identifier: GPL-3.0-or-later
#include <cmath>

#include <gtest/gtest.h>

#include "tonewalk/maths/distribution.hpp"

namespace tonewalk {
namespace {

TEST(LinePower, WithoutALineFollowsFisher) {
    for (const double k : {8.0, 20.0, 200.0}) {
        for (const double x : {0.05, 1.0, 3.0, 7.0}) {
            const double fisher = 1.0 - std::pow(1.0 + x / k, -k); // F(2, 2K) in closed form
            EXPECT_NEAR(line_power_cdf(x, 2.0, 2.0 * k, 0.0), fisher, 3e-4) << k << ' ' << x;
        }
    }
}

TEST(LinePower, InKnownNoiseIsNoncentralChiSquare) {
    for (const double line : {0.5, 9.0, 120.0}) {
        const double x = 1.0 + line / 2.0;
        EXPECT_NEAR(line_power_cdf(x, 2.0, 1e9, line),
                    noncentral_chi_square_cdf(2.0 * x, 2.0, line), 1e-4);
    }
}

// Mean of noncentral chi-square: degrees + noncentrality; variance: 2 (degrees + 2 noncentrality);
// both from the definition as a sum of squared Gaussians.
TEST(LinePower, NoncentralChiSquareHasItsMeanAndVariance) {
    for (const double degrees : {2.0, 4.0}) {
        for (const double noncentrality : {0.0, 3.0, 40.0}) {
            double mean = 0.0, square = 0.0;
            constexpr double step = 0.01, most = 250.0;
            for (double x = 0.5 * step; x < most; x += step) {
                const double above = 1.0 - noncentral_chi_square_cdf(x, degrees, noncentrality);
                mean += above * step;
                square += 2.0 * x * above * step;
            }
            EXPECT_NEAR(mean, degrees + noncentrality, 1e-3);
            EXPECT_NEAR(square - mean * mean, 2.0 * (degrees + 2.0 * noncentrality), 0.05);
        }
    }
}

TEST(LinePower, OfAStrongLineIsBoundedByStudentsT) {
    for (const double degrees : {2.0, 4.0}) {
        for (const double k : {8.0, 40.0, 400.0}) {
            const double amplitude = 25.0; // in deviations of one quadrature
            const double x = (amplitude * amplitude + degrees - 1.0) / degrees;
            for (const double p : {0.025, 0.975}) {
                const double bound = std::sqrt(line_power_inverse(x, p, degrees, 2.0 * k));
                EXPECT_NEAR(bound - amplitude, -student_t_quantile(p, 2.0 * k), 0.03)
                    << degrees << ' ' << k;
            }
        }
    }
}

TEST(LinePower, IsZeroWhereEvenNoLineIsTooMuch) {
    EXPECT_EQ(line_power_inverse(0.01, 0.975, 2.0, 100.0), 0.0);
}

} // namespace
} // namespace tonewalk
