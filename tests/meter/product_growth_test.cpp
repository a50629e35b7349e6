// SPDX-License-Identifier: GPL-3.0-or-later
#include "../../src/meter/product_growth.hpp"

#include <cmath>
#include <functional>
#include <numbers>
#include <vector>

#include <gtest/gtest.h>

namespace tonewalk {
namespace {

constexpr double depth = 0.6;

/// Carrier, tone and second harmonic of A (1 + m cos), sent through a curve.
modulation_lines bent(double amplitude, const std::function<double(double)>& curve) {
    constexpr std::size_t points = 512;
    double carrier = 0.0, tone = 0.0, second = 0.0;
    for (std::size_t k = 0; k < points; ++k) {
        const double angle = 2.0 * std::numbers::pi * static_cast<double>(k) / points;
        const double e = curve(amplitude * (1.0 + depth * std::cos(angle)));
        carrier += e / points;
        tone += 2.0 * e * std::cos(angle) / points;
        second += 2.0 * e * std::cos(2.0 * angle) / points;
    }
    return {static_cast<float>(carrier), static_cast<float>(tone), static_cast<float>(second),
            0.0F};
}

/// Carriers from full scale down by 20 dB, evenly in decibels, in ten fades after one another.
std::vector<modulation_lines> fading(const std::function<double(double)>& curve) {
    std::vector<modulation_lines> records;
    for (int k = 0; k <= 100; ++k) {
        const int level = 10 * k % 101;
        records.push_back(bent(std::pow(10.0, -level / 100.0), curve));
    }
    return records;
}

// (1 + m cos)^3 = ... + 3/2 m^2 cos 2x; carrier and tone bend by 3/2 m^2 and 3 m + 3/4 m^3.
TEST(ProductGrowth, OfASmallCubicBendIsToldByProductsAndDepthAlike) {
    for (const double bend : {-2e-3, 2e-3}) {
        const product_growth g =
            fit_growth(fading([bend](double e) { return e * (1.0 + bend * e * e); }), 0.0);
        EXPECT_NEAR(g.from_products.value, bend, 0.02 * std::abs(bend));
        EXPECT_NEAR(g.from_depth.value, bend, 0.02 * std::abs(bend));
        EXPECT_NEAR(g.depth, depth, 1e-4);
        EXPECT_EQ(depth_agrees(g), bend < 0.0);
    }
}

TEST(ProductGrowth, IsNoneWhereTheSecondHarmonicKeepsItsShare) {
    std::vector<modulation_lines> records = fading([](double e) { return e; });
    for (modulation_lines& r : records) {
        r.second = -0.05F * r.carrier;
    }
    const product_growth g = fit_growth(records, 1e-8);
    EXPECT_NEAR(g.from_products.value, 0.0, 1e-6);
    EXPECT_FALSE(depth_agrees(g));
}

// Noise of power N a line: the error of a slope over A^3 beside one over A, by least squares.
TEST(ProductGrowth, HasAtLeastTheErrorThatTheNoiseGives) {
    constexpr double noise = 1e-6;
    const std::vector<modulation_lines> records = fading([](double e) { return e; });
    double a2 = 0.0, a4 = 0.0, a6 = 0.0;
    for (const modulation_lines& r : records) {
        const double square = std::pow(static_cast<double>(r.carrier), 2);
        a2 += square;
        a4 += square * square;
        a6 += square * square * square;
    }
    const double slope_error = std::sqrt(noise / (a6 - a4 * a4 / a2));
    const product_growth g = fit_growth(records, noise);
    EXPECT_NEAR(g.from_products.error, slope_error / (1.5 * depth * depth),
                0.001 * g.from_products.error);
}

TEST(CrestLoss, OfASaturatingCurveIsThatOfItsHighestCrest) {
    for (const double loss_db : {0.1, 0.5, 1.0, 2.0, 3.0}) {
        const double crest = 1.0 + depth;
        const double square = crest * crest / (std::pow(10.0, loss_db / 10.0) - 1.0); // s^2
        const auto records =
            fading([square](double e) { return e / std::sqrt(1.0 + e * e / square); });
        const product_growth g = fit_growth(records, 0.0);
        EXPECT_NEAR(crest_loss_db(records, g), loss_db, 0.13 * loss_db);
        EXPECT_TRUE(depth_agrees(g)) << loss_db;
    }
}

// What is cut off the crests alone bends the depth less against the products than a cubic does.
TEST(ProductGrowth, OfAHardLimitIsTheSameCurveToDepthAndProducts) {
    for (const double limit : {1.4, 1.2, 1.0}) {
        const product_growth g =
            fit_growth(fading([limit](double e) { return std::min(e, limit); }), 0.0);
        EXPECT_LT(g.from_products.value, 0.0) << limit;
        EXPECT_TRUE(depth_agrees(g)) << limit;
    }
}

TEST(ProductGrowth, ThatTheDepthDoesNotShareIsNotAgreedTo) {
    std::vector<modulation_lines> records = fading([](double e) { return e; });
    for (modulation_lines& r : records) {
        r.second = -0.05F * r.carrier * r.carrier * r.carrier;
    }
    EXPECT_FALSE(depth_agrees(fit_growth(records, 1e-10)));
}

} // namespace
} // namespace tonewalk
