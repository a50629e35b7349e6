// SPDX-License-Identifier: GPL-3.0-or-later
#include "product_growth.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>

namespace tonewalk {
namespace {

constexpr std::size_t parts = 10; // that are left out one after another

/// y = linear A + cubic A^3 over the carrier's amplitude A.
struct line_growth {
    double linear = 0.0, cubic = 0.0;
};

/// What both fits need of some records; parts can be taken off again.
struct growth_sums {
    double a2 = 0.0, a4 = 0.0, a6 = 0.0;
    double tone_a = 0.0, tone_a3 = 0.0, second_a = 0.0, second_a3 = 0.0;

    void add(const modulation_lines& r) noexcept {
        const double a = static_cast<double>(r.carrier), a3 = a * a * a;
        a2 += a * a;
        a4 += a * a3;
        a6 += a3 * a3;
        tone_a += a * static_cast<double>(r.tone);
        tone_a3 += a3 * static_cast<double>(r.tone);
        second_a += a * static_cast<double>(r.second);
        second_a3 += a3 * static_cast<double>(r.second);
    }
    [[nodiscard]] growth_sums without(const growth_sums& part) const noexcept {
        return {a2 - part.a2,
                a4 - part.a4,
                a6 - part.a6,
                tone_a - part.tone_a,
                tone_a3 - part.tone_a3,
                second_a - part.second_a,
                second_a3 - part.second_a3};
    }
    [[nodiscard]] double determinant() const noexcept { return a2 * a6 - a4 * a4; }
    [[nodiscard]] line_growth of_tone() const noexcept { return solved(tone_a, tone_a3); }
    [[nodiscard]] line_growth of_second() const noexcept { return solved(second_a, second_a3); }

private:
    [[nodiscard]] line_growth solved(double ya, double ya3) const noexcept {
        return {(ya * a6 - ya3 * a4) / determinant(), (ya3 * a2 - ya * a4) / determinant()};
    }
};

/// (1 + m cos)^3 in harmonics: the curve's bend over the second harmonic's growth, and over that of
/// the tone's share of the carrier, whose own line bends as well.
double second_per_bend(double m) noexcept {
    return 1.5 * m * m;
}
double tone_per_bend(double m) noexcept {
    return m * (2.0 - 0.75 * m * m);
}

product_growth bends(const growth_sums& sums) noexcept {
    const line_growth tone = sums.of_tone(), second = sums.of_second();
    const double m = tone.linear;
    return {{second.cubic / second_per_bend(m), 0.0}, {tone.cubic / tone_per_bend(m), 0.0}, m};
}

/// The lines before the envelope went through r / sqrt(1 + r^2/s^2); `bent` is 1/s^2.
modulation_lines straightened(const modulation_lines& r, double bent) noexcept {
    constexpr std::size_t points = 16; // over half a period, between cosines that mirror each other
    constexpr double most = 0.97;
    double carrier = 0.0, tone = 0.0, second = 0.0;
    for (std::size_t k = 0; k < points; ++k) {
        const double angle = std::numbers::pi * (static_cast<double>(k) + 0.5) / points;
        const double once = std::cos(angle), twice = std::cos(2.0 * angle);
        const double bowed = static_cast<double>(r.carrier) + static_cast<double>(r.tone) * once +
                             static_cast<double>(r.second) * twice;
        const double straight = bowed / std::sqrt(1.0 - std::min(most, bent * bowed * bowed));
        carrier += straight / points;
        tone += 2.0 * straight * once / points;
        second += 2.0 * straight * twice / points;
    }
    return {static_cast<float>(carrier), static_cast<float>(tone), static_cast<float>(second),
            r.noise};
}

/// Of equal weight in the fit, so that each holds a tenth of what tells the bend.
std::array<growth_sums, parts> in_parts(std::span<const modulation_lines> records) noexcept {
    double whole = 0.0, done = 0.0;
    for (const modulation_lines& r : records) {
        whole += std::pow(static_cast<double>(r.carrier), 2);
    }
    std::array<growth_sums, parts> sums;
    for (const modulation_lines& r : records) {
        const double share = static_cast<double>(parts) * done / whole;
        sums[std::min(parts - 1, static_cast<std::size_t>(share))].add(r);
        done += std::pow(static_cast<double>(r.carrier), 2);
    }
    return sums;
}

/// Standard error from how a value changes when one part after another is left out.
double jackknife_error(const std::array<double, parts>& left_out) noexcept {
    double mean = 0.0, squares = 0.0;
    for (const double value : left_out) {
        mean += value / static_cast<double>(parts);
    }
    for (const double value : left_out) {
        squares += (value - mean) * (value - mean);
    }
    return std::sqrt(squares * static_cast<double>(parts - 1) / static_cast<double>(parts));
}

} // namespace

product_growth fit_growth(std::span<const modulation_lines> records, double line_noise) {
    growth_sums all;
    for (const modulation_lines& r : records) {
        all.add(r);
    }
    product_growth growth = bends(all);
    std::array<double, parts> products{}, depth{};
    const std::array<growth_sums, parts> each = in_parts(records);
    for (std::size_t k = 0; k < parts; ++k) {
        const product_growth rest = bends(all.without(each[k]));
        products[k] = rest.from_products.value;
        depth[k] = rest.from_depth.value;
    }
    // Two lines of noise N each, of which half is in phase.
    const double cubic_error = std::sqrt(line_noise * all.a2 / all.determinant());
    growth.from_products.error =
        std::max(cubic_error / second_per_bend(growth.depth), jackknife_error(products));
    growth.from_depth.error =
        std::max(cubic_error / tone_per_bend(growth.depth), jackknife_error(depth));
    return growth;
}

bool depth_agrees(const product_growth& g) noexcept {
    constexpr double sigmas = 3.0, least_share = 0.5, most = 1.7;
    const double m = std::clamp(g.depth, 0.0, 1.0);
    // A limit that only touches the crests takes as much off the second harmonic as off the tone.
    const double hard_limit = 0.75 * m * (2.0 - m) / (2.0 - 0.75 * m * m);
    const double products = -g.from_products.value, depth = -g.from_depth.value;
    const double doubt = sigmas * g.from_depth.error;
    return depth > doubt && depth + doubt >= least_share * hard_limit * products &&
           depth - doubt <= most * products;
}

double crest_loss_db(std::span<const modulation_lines> records, const product_growth& growth) {
    constexpr double most_bent = 0.937; // e^2/s^2: 12 dB
    constexpr int halvings = 30;
    double crest = 0.0;
    for (const modulation_lines& r : records) {
        crest = std::max(crest, static_cast<double>(r.carrier + r.tone));
    }
    const double square = crest * crest;
    if (growth.from_products.value >= 0.0) {
        return -10.0 * std::log10(1.0 + 2.0 * growth.from_products.value * square);
    }
    double low = 0.0, high = most_bent / square; // of 1/s^2
    for (int k = 0; k < halvings; ++k) {
        const double middle = 0.5 * (low + high);
        growth_sums undone;
        for (const modulation_lines& r : records) {
            undone.add(straightened(r, middle));
        }
        (undone.of_second().cubic < 0.0 ? low : high) = middle;
    }
    return -10.0 * std::log10(1.0 - low * square);
}

} // namespace tonewalk
