// SPDX-License-Identifier: GPL-3.0-or-later
#include "noise_rise.hpp"

#include <algorithm>
#include <cmath>

#include "tonewalk/maths/quantile.hpp"

namespace tonewalk {
namespace {

constexpr std::size_t least_group = 10; // of records below or above a carrier level

/// A straight line through the noise over the carrier: a gain that follows all along.
value_and_error rise_of_line(const std::vector<level_pair>& pairs, double range_db,
                             double inflation) {
    const auto n = static_cast<double>(pairs.size());
    double mean_c = 0.0, mean_n = 0.0;
    for (const level_pair& p : pairs) {
        mean_c += p.carrier_db / n;
        mean_n += p.noise_db / n;
    }
    double cc = 0.0, cn = 0.0, nn = 0.0;
    for (const level_pair& p : pairs) {
        cc += (p.carrier_db - mean_c) * (p.carrier_db - mean_c);
        cn += (p.carrier_db - mean_c) * (p.noise_db - mean_n);
        nn += (p.noise_db - mean_n) * (p.noise_db - mean_n);
    }
    const double slope = cn / cc;
    const double variance = std::max(0.0, nn - slope * cn) / (n - 2.0) / cc * inflation;
    return {-slope * range_db, std::sqrt(variance) * range_db};
}

/// Two levels of noise, below and above some carrier level: a gain that reaches its stops. The
/// split that shows most.
value_and_error rise_of_split(const noise_means& by_carrier, std::size_t records) {
    value_and_error best{0.0, 1.0};
    for (std::size_t k = least_group; k + least_group <= records; ++k) {
        const value_and_error rise = by_carrier.difference({0, k}, {k, records});
        if (rise.value * best.error > best.value * rise.error) {
            best = rise;
        }
    }
    return best;
}

} // namespace

noise_rise find_noise_rise(std::vector<level_pair> pairs, double inflation) {
    noise_rise found;
    std::stable_sort(pairs.begin(), pairs.end(), [](const level_pair& a, const level_pair& b) {
        return a.carrier_db < b.carrier_db;
    });
    std::vector<double> carriers;
    carriers.reserve(pairs.size());
    for (const level_pair& p : pairs) {
        carriers.push_back(p.carrier_db);
    }
    found.range_db = quantile_sorted(carriers, 0.98) - quantile_sorted(carriers, 0.02);
    if (found.range_db <= 0.0) {
        return found;
    }
    const noise_means by_carrier{pairs, inflation};
    const value_and_error line = rise_of_line(pairs, found.range_db, inflation);
    const std::size_t half = pairs.size() / 2;
    found.visible_db =
        noise_rise_sigmas * by_carrier.difference({0, half}, {half, pairs.size()}).error;
    for (const value_and_error& rise : {line, rise_of_split(by_carrier, pairs.size())}) {
        if (rise.value > found.db && rise.value > noise_rise_sigmas * rise.error) {
            found.db = rise.value;
        }
        found.sigmas = std::max(found.sigmas, rise.value / rise.error);
    }
    found.db = found.db > 0.0 ? found.db : line.value;
    return found;
}

} // namespace tonewalk
