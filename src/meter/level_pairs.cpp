// SPDX-License-Identifier: GPL-3.0-or-later
#include "level_pairs.hpp"

#include <algorithm>
#include <numbers>

namespace tonewalk {

std::vector<level_pair> pairs_of(const level_log& log) {
    std::vector<level_pair> pairs;
    for (const level_record& r : log.records) {
        if (!std::isnan(r.carrier_dbfs.value) && r.noise_power > 0.0) {
            const double relative = r.carrier.sigma / std::sqrt(r.carrier.power);
            pairs.push_back({r.time_s, r.carrier_dbfs.value, 20.0 / std::numbers::ln10 * relative,
                             10.0 * std::log10(r.noise_power), r.stretch});
        }
    }
    return pairs;
}

noise_means::noise_means(const std::vector<level_pair>& pairs, double inflation)
    : inflation_{inflation} {
    double mean = 0.0;
    for (const level_pair& p : pairs) {
        mean += p.noise_db / static_cast<double>(pairs.size());
    }
    for (const level_pair& p : pairs) {
        const double x = p.noise_db - mean;
        sums_.push_back(sums_.back() + x);
        squares_.push_back(squares_.back() + x * x);
    }
}

noise_means::moments noise_means::of(const run& r) const noexcept {
    const auto n = static_cast<double>(r.past - r.first);
    const double mean = (sums_[r.past] - sums_[r.first]) / n;
    return {n, mean, std::max(0.0, squares_[r.past] - squares_[r.first] - n * mean * mean)};
}

value_and_error noise_means::difference(const run& above, const run& below) const noexcept {
    const moments a = of(above), b = of(below);
    const double variance = (a.scatter + b.scatter) / (a.records + b.records - 2.0);
    return {a.mean - b.mean,
            std::sqrt(variance * inflation_ * (1.0 / a.records + 1.0 / b.records))};
}

} // namespace tonewalk
