// SPDX-License-Identifier: GPL-3.0-or-later
#include "gain_steps.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <optional>

namespace tonewalk {
namespace {

constexpr double least_step_db = 0.4;
// A whole log is searched: 1.96 would find steps anywhere.
constexpr double step_sigmas = 4.0;    // of the noise
constexpr double carrier_sigmas = 2.5; // of the carrier, where the noise steps as well
constexpr double step_side_s = 10.0;
constexpr std::size_t least_side = 20; // records on either side

/// By how much the carrier steps between two records, however it fades: differences of records on
/// either side, nearest first, weighted so that a fade that bends like a polynomial of degree 0, 2,
/// 4 or 6 falls out.
constexpr std::size_t step_orders = 4;
constexpr std::array<std::array<double, step_orders>, step_orders> step_weights{{
    {1.0, 0.0, 0.0, 0.0},
    {3.0 / 2.0, -1.0 / 2.0, 0.0, 0.0},
    {10.0 / 6.0, -5.0 / 6.0, 1.0 / 6.0, 0.0},
    {35.0 / 20.0, -21.0 / 20.0, 7.0 / 20.0, -1.0 / 20.0},
}};

/// Whether [first, last] are neighbours in time, none missing.
bool are_unbroken(const std::vector<level_pair>& pairs, std::size_t first, std::size_t last,
                  double every_s) {
    const double longest_s = (static_cast<double>(last - first) + 0.5) * every_s;
    return pairs[first].stretch == pairs[last].stretch &&
           pairs[last].time_s - pairs[first].time_s < longest_s;
}

/// Between record k and the one `across` further on. Of two orders the step itself falls out of the
/// difference: it is what the lower one leaves of the fade. The surest order counts.
std::optional<value_and_error> carrier_step(const std::vector<level_pair>& pairs, std::size_t k,
                                            std::size_t across, double every_s) {
    const std::size_t reach = (step_orders - 1) * across;
    if (k < reach || k + across + reach >= pairs.size() ||
        !are_unbroken(pairs, k - reach, k + across + reach, every_s)) {
        return std::nullopt;
    }
    std::array<double, step_orders> steps{}, noise{};
    for (std::size_t order = 0; order < step_orders; ++order) {
        for (std::size_t n = 0; n <= order; ++n) {
            const level_pair &after = pairs[k + across + n * across],
                             &before = pairs[k - n * across];
            const double weight = step_weights[order][n];
            steps[order] += weight * (after.carrier_db - before.carrier_db);
            noise[order] = std::hypot(noise[order], weight * after.carrier_sigma_db,
                                      weight * before.carrier_sigma_db);
        }
    }
    value_and_error best{steps[0], std::hypot(noise[0], steps[1] - steps[0])};
    for (std::size_t order = 1; order + 1 < step_orders; ++order) {
        const double error = std::hypot(noise[order], steps[order + 1] - steps[order]);
        if (error < best.error) {
            best = {steps[order], error};
        }
    }
    return best;
}

/// The one step that both show, weighted by what each knows.
double both(const value_and_error& carrier, const value_and_error& noise) {
    const double c = carrier.error * carrier.error, n = noise.error * noise.error;
    return c + n > 0.0 ? (carrier.value * n + noise.value * c) / (c + n) : carrier.value;
}

bool are_alike(const value_and_error& carrier, const value_and_error& noise) {
    constexpr double least_difference_db = 0.15, sigmas = 4.0;
    const double doubt = sigmas * std::hypot(carrier.error, noise.error);
    return std::abs(carrier.value - noise.value) < std::max(least_difference_db, doubt);
}

} // namespace

gain_step find_gain_step(const std::vector<level_pair>& pairs, const level_log& log,
                         double inflation) {
    const noise_means noise{pairs, inflation};
    const auto side = static_cast<std::size_t>(std::max(4.0, step_side_s / log.every_s));
    const auto across = // two windows that hardly overlap
        std::max<std::size_t>(2, static_cast<std::size_t>(std::ceil(log.window_s / log.every_s)));
    gain_step best;
    for (std::size_t k = least_side; k + across + least_side < pairs.size(); ++k) {
        const std::optional<value_and_error> carrier = carrier_step(pairs, k, across, log.every_s);
        if (!carrier || !carrier->exceeds(carrier_sigmas)) {
            continue;
        }
        const std::size_t after = k + across;
        const value_and_error step = noise.difference({after, std::min(pairs.size(), after + side)},
                                                      {k + 1 > side ? k + 1 - side : 0, k + 1});
        const double step_db = both(*carrier, step), sigmas = std::abs(step.value) / step.error;
        if (std::abs(step_db) >= least_step_db && step.exceeds(step_sigmas) &&
            are_alike(*carrier, step) && sigmas > best.sigmas) {
            best = {step_db, 0.5 * (pairs[k].time_s + pairs[after].time_s), sigmas};
        }
    }
    return best;
}

} // namespace tonewalk
