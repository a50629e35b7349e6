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

/// A value and its standard error, in decibels.
struct value_and_error {
    double value = 0.0, error = 0.0;
    [[nodiscard]] bool exceeds(double sigmas) const { return std::abs(value) > sigmas * error; }
};

/// Means of the noise over runs of records, from sums up to each. Neighbours overlap and scatter
/// together: `inflation` of them tell what one would.
class noise_means {
public:
    noise_means(const std::vector<level_pair>&, double inflation);
    /// Records [first, past).
    struct run {
        std::size_t first = 0, past = 0;
    };
    /// By how much the noise of one run lies above that of another; the error is from the scatter
    /// inside both together, three records at least.
    [[nodiscard]] value_and_error difference(const run&, const run&) const noexcept;

private:
    struct moments {
        double records = 0.0, mean = 0.0, scatter = 0.0; // scatter: sum of squares about the mean
    };
    [[nodiscard]] moments of(const run&) const noexcept;
    double inflation_;
    std::vector<double> sums_{0.0}, squares_{0.0}; // about the mean of all
};

} // namespace tonewalk
