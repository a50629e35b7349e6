// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cmath>
#include <cstdint>
#include <vector>

#include "tonewalk/meter/level_log.hpp"

namespace tonewalk {

/// Carrier and noise of the records that told both, in decibels.
struct level_pair {
    double time_s = 0.0, carrier_db = 0.0, carrier_sigma_db = 0.0, noise_db = 0.0;
    std::uint32_t stretch = 0;
};
[[nodiscard]] std::vector<level_pair> pairs_of(const level_log&);

/// A mean or a difference of means, and its standard error.
struct mean_and_error {
    double mean = 0.0, error = 0.0;
    [[nodiscard]] bool exceeds(double sigmas) const { return std::abs(mean) > sigmas * error; }
};
[[nodiscard]] mean_and_error difference(const mean_and_error&, const mean_and_error&) noexcept;

/// Means of the noise over runs of records, from sums up to each. Neighbours overlap and scatter
/// together: `inflation` of them tell what one would.
class noise_means {
public:
    noise_means(const std::vector<level_pair>&, double inflation);
    /// Of records [first, past), two at least; the error is the scatter's.
    [[nodiscard]] mean_and_error over(std::size_t first, std::size_t past) const noexcept;

private:
    double inflation_, middle_ = 0.0;
    std::vector<double> sums_{0.0}, squares_{0.0};
};

} // namespace tonewalk
