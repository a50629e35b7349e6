// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/maths/parabola_fit.hpp"

#include <cmath>
#include <vector>

#include <gtest/gtest.h>

#include "tonewalk/base/random.hpp"

namespace tonewalk {
namespace {

std::vector<weighted_value> parabola(double x0, double y0, double bend, double step, int points,
                                     double sigma) {
    std::vector<weighted_value> values;
    for (int k = 0; k < points; ++k) {
        const double x = 100.0 + step * k;
        values.push_back({x, y0 + 0.5 * bend * (x - x0) * (x - x0), sigma});
    }
    return values;
}

} // namespace

TEST(ParabolaFit, FindsTheTurningPointOfAParabola) {
    const auto vertex = fit_parabola(parabola(100.43, -7.5, 3.0, 0.1, 9, 0.01));
    ASSERT_TRUE(vertex);
    EXPECT_NEAR(vertex->x, 100.43, 1e-9);
    EXPECT_NEAR(vertex->y, -7.5, 1e-9);
    EXPECT_NEAR(vertex->bend, 3.0, 1e-8);
}

TEST(ParabolaFit, ItsSigmasAreTheScatterOverSeeds) {
    constexpr int seeds = 2000;
    const auto clean = parabola(100.43, -7.5, 3.0, 0.1, 9, 0.01);
    double x_squares = 0.0, y_squares = 0.0, x_sigma = 0.0, y_sigma = 0.0;
    for (int seed = 0; seed < seeds; ++seed) {
        random_stream random{static_cast<std::uint64_t>(seed)};
        auto noisy = clean;
        for (weighted_value& v : noisy) {
            v.y += v.sigma * random.gaussian();
        }
        const auto vertex = fit_parabola(noisy);
        ASSERT_TRUE(vertex);
        x_squares += std::pow(vertex->x - 100.43, 2.0);
        y_squares += std::pow(vertex->y + 7.5, 2.0);
        x_sigma += vertex->x_sigma / seeds;
        y_sigma += vertex->y_sigma / seeds;
    }
    EXPECT_NEAR(std::sqrt(x_squares / seeds), x_sigma, 0.07 * x_sigma);
    EXPECT_NEAR(std::sqrt(y_squares / seeds), y_sigma, 0.07 * y_sigma);
}

TEST(ParabolaFit, CorrelationWidensTheSigmas) {
    const auto points = parabola(100.43, -7.5, 3.0, 0.1, 9, 0.01);
    EXPECT_NEAR(fit_parabola(points, 4.0)->x_sigma, 2.0 * fit_parabola(points)->x_sigma, 1e-12);
}

TEST(ParabolaFit, GivesNothingWithoutABendOrEnoughPoints) {
    EXPECT_FALSE(fit_parabola(parabola(100.0, 0.0, 1.0, 0.1, 3, 1.0)));
    EXPECT_FALSE(fit_parabola(parabola(100.0, 0.0, 1.0, 0.0, 5, 1.0)));
    EXPECT_FALSE(fit_parabola(parabola(100.0, 2.0, 0.0, 0.1, 5, 1.0)));
}

} // namespace tonewalk
