// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/maths/distribution.hpp"

#include <cmath>
#include <sstream>

#include <gtest/gtest.h>

#include "support/run_command.hpp"

namespace tonewalk {
namespace {

// Sums the noncentral chi-square distribution from its definition (a Poisson mixture of central
// ones) with scipy's regularised incomplete gamma function, for every combination of the lists.
constexpr const char* mixture = R"(
import numpy as np
from scipy import special, stats
for degrees in (2.0, 4.0):
    for nc in (1e-6, 0.3, 4.0, 50.0, 1000.0, 1e4):
        for share in (0.05, 0.6, 1.0, 1.3, 3.0):
            x = share * (degrees + nc)
            reach = 12 * np.sqrt(nc / 2) + 60
            j = np.arange(max(0, int(nc / 2 - reach)), int(nc / 2 + reach))
            p = np.sum(stats.poisson.pmf(j, nc / 2) * special.gammainc(degrees / 2 + j, x / 2))
            print(repr(degrees), repr(nc), repr(float(x)), repr(float(p)))
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

TEST(OutsideDistribution, NoncentralChiSquareIsRightToNineDecimals) {
    if (!has_scipy()) {
        GTEST_SKIP() << "scipy is missing";
    }
    std::istringstream lines = output_of(mixture);
    double degrees = 0, noncentrality = 0, x = 0, p = 0;
    int rows = 0;
    for (; lines >> degrees >> noncentrality >> x >> p; ++rows) {
        EXPECT_NEAR(noncentral_chi_square_cdf(x, degrees, noncentrality), p, 1e-9)
            << degrees << ' ' << noncentrality << ' ' << x;
    }
    EXPECT_EQ(rows, 2 * 6 * 5);
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

} // namespace tonewalk
