// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/maths/quantile.hpp"

#include <algorithm>
#include <cmath>

#include "tonewalk/base/estimate.hpp"

namespace tonewalk {

double quantile_sorted(std::span<const double> sorted, double q) noexcept {
    if (sorted.empty()) {
        return not_measured;
    }
    const double position = q * static_cast<double>(sorted.size() - 1);
    const auto below = static_cast<std::size_t>(position);
    const std::size_t above = std::min(below + 1, sorted.size() - 1);
    const double share = position - static_cast<double>(below);
    if (share == 0.0 || std::isinf(sorted[below])) { // minus infinity stays what it is
        return sorted[below];
    }
    return sorted[below] + share * (sorted[above] - sorted[below]);
}

double quantile(std::vector<double> values, double q) {
    std::sort(values.begin(), values.end());
    return quantile_sorted(values, q);
}

double median(std::vector<double> values) {
    return quantile(std::move(values), 0.5);
}

} // namespace tonewalk
