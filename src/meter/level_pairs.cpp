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

mean_and_error difference(const mean_and_error& a, const mean_and_error& b) noexcept {
    return {a.mean - b.mean, std::hypot(a.error, b.error)};
}

noise_means::noise_means(const std::vector<level_pair>& pairs, double inflation)
    : inflation_{inflation} {
    for (const level_pair& p : pairs) {
        middle_ += p.noise_db / static_cast<double>(pairs.size());
    }
    for (const level_pair& p : pairs) {
        const double x = p.noise_db - middle_;
        sums_.push_back(sums_.back() + x);
        squares_.push_back(squares_.back() + x * x);
    }
}

mean_and_error noise_means::over(std::size_t first, std::size_t past) const noexcept {
    const auto n = static_cast<double>(past - first);
    const double mean = (sums_[past] - sums_[first]) / n;
    const double variance =
        std::max(0.0, (squares_[past] - squares_[first]) / n - mean * mean) * n / (n - 1.0);
    return {middle_ + mean, std::sqrt(variance / n * inflation_)};
}

} // namespace tonewalk
