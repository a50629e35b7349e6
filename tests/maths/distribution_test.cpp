// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/maths/distribution.hpp"

#include <cmath>
#include <sstream>

#include <gtest/gtest.h>

#include "support/run_command.hpp"

namespace tonewalk {
namespace {

// Sums the noncentral F distribution from its definition (a Poisson mixture of beta distributions)
// with scipy's regularised incomplete beta function, for every combination of the lists.
constexpr const char* mixture = R"(
import numpy as np
from scipy import special, stats
for above in (2.0, 4.0):
    for below in (4.0, 16.0, 64.0, 1000.0, 1e6):
        for nc in (1e-6, 0.3, 4.0, 50.0, 1000.0, 1e4):
            mean = (above + nc) / above
            for x in (0.05 * mean, 0.6 * mean, mean, 1.3 * mean, 3.0 * mean):
                half = nc / 2
                reach = 12 * np.sqrt(half) + 60
                j = np.arange(max(0, int(half - reach)), int(half + reach))
                y = above * x / (above * x + below)
                p = np.sum(stats.poisson.pmf(j, half) * special.betainc(above / 2 + j, below / 2, y))
                print(repr(float(above)), repr(float(below)), repr(float(nc)), repr(float(x)), repr(float(p)))
)";

constexpr const char* central = R"(
from scipy import stats
for p in (1e-6, 1e-3, 0.025, 0.5, 0.9, 0.975, 0.999, 1 - 1e-6):
    print(p, stats.norm.ppf(p), stats.t.ppf(p, 7.5), stats.chi2.ppf(p, 3), stats.chi2.cdf(40 * p, 11), stats.f.ppf(p, 4, 37))
)";

std::istringstream output_of(const char* script) {
    const std::string python = TONEWALK_TEST_PYTHON " -c ";
    const auto run = test::run_command(python + test::shell_quoted(script));
    EXPECT_EQ(run.status, 0) << run.output;
    return std::istringstream{run.output};
}

bool has_scipy() {
    return test::run_command(TONEWALK_TEST_PYTHON " -c 'import scipy'").status == 0;
}

} // namespace

TEST(OutsideDistribution, NoncentralFIsRightToAMillionth) {
    if (!has_scipy()) {
        GTEST_SKIP() << "scipy is missing";
    }
    std::istringstream lines = output_of(mixture);
    double above = 0, below = 0, noncentrality = 0, x = 0, p = 0;
    int rows = 0;
    for (; lines >> above >> below >> noncentrality >> x >> p; ++rows) {
        EXPECT_NEAR(noncentral_f_cdf(x, above, below, noncentrality), p, 1e-6)
            << above << ' ' << below << ' ' << noncentrality << ' ' << x;
    }
    EXPECT_EQ(rows, 2 * 5 * 6 * 5);
}

TEST(OutsideDistribution, QuantilesAgreeWithScipy) {
    if (!has_scipy()) {
        GTEST_SKIP() << "scipy is missing";
    }
    std::istringstream lines = output_of(central);
    double p = 0, normal = 0, student = 0, chi = 0, chi_cdf = 0, f = 0;
    int rows = 0;
    for (; lines >> p >> normal >> student >> chi >> chi_cdf >> f; ++rows) {
        EXPECT_NEAR(normal_quantile(p), normal, 1e-9);
        EXPECT_NEAR(student_t_quantile(p, 7.5), student, 1e-7 * (1.0 + std::abs(student)));
        EXPECT_NEAR(chi_square_quantile(p, 3.0), chi, 1e-8 * chi);
        EXPECT_NEAR(chi_square_cdf(40.0 * p, 11.0), chi_cdf, 1e-10);
        EXPECT_NEAR(f_quantile(p, 4.0, 37.0), f, 1e-8 * f);
    }
    EXPECT_EQ(rows, 8);
}

// Percentage points as every statistical table prints them (from memory).
TEST(Distribution, AgreesWithPrintedTables) {
    EXPECT_NEAR(normal_quantile(0.975), 1.95996, 5e-6);
    EXPECT_NEAR(student_t_quantile(0.975, 1.0), 12.706, 5e-4);
    EXPECT_NEAR(student_t_quantile(0.975, 10.0), 2.228, 5e-4);
    EXPECT_NEAR(chi_square_quantile(0.95, 1.0), 3.841, 5e-4);
    EXPECT_NEAR(chi_square_quantile(0.95, 10.0), 18.307, 5e-4);
    EXPECT_NEAR(f_quantile(0.95, 4.0, 10.0), 3.48, 5e-3);
}

// Closed form: two degrees of freedom give 1 - e^(-x/2).
TEST(Distribution, ChiSquareOfTwoDegreesIsExponential) {
    for (const double x : {1e-6, 0.1, 1.0, 10.0, 50.0}) {
        EXPECT_NEAR(chi_square_cdf(x, 2.0), -std::expm1(-x / 2.0), 1e-14);
    }
}

// Closed form: F(x; 2, b) = 1 - (1 + 2 x / b)^(-b/2).
TEST(Distribution, NoncentralFBeginsWithTheCentralOne) {
    for (const double x : {0.01, 1.0, 8.0}) {
        const double truth = 1.0 - std::pow(1.0 + 2.0 * x / 20.0, -10.0);
        EXPECT_NEAR(noncentral_f_cdf(x, 2.0, 20.0, 0.0), truth, 1e-13);
        EXPECT_NEAR(noncentral_f_cdf(x, 2.0, 20.0, 1e-9), truth, 1e-9);
    }
    EXPECT_EQ(noncentral_f_cdf(0.0, 2.0, 20.0, 3.0), 0.0);
    EXPECT_EQ(noncentral_f_cdf(-1.0, 2.0, 20.0, 3.0), 0.0);
}

TEST(Distribution, NoncentralityIsTheInverseOfTheDistribution) {
    for (const double below : {4.0, 32.0, 1e3, 8e3}) {
        for (const double p : {0.025, 0.5, 0.975}) {
            for (const double x : {0.5, 2.0, 30.0, 324.0}) {
                const double found = noncentral_f_noncentrality(x, p, 4.0, below);
                if (found > 0.0) {
                    EXPECT_NEAR(noncentral_f_cdf(x, 4.0, below, found), p, 1e-9);
                } else {
                    EXPECT_LE(noncentral_f_cdf(x, 4.0, below, 0.0), p);
                }
            }
        }
    }
}

} // namespace tonewalk
