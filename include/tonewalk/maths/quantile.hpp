// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <span>
#include <vector>

namespace tonewalk {

/// Linear between order statistics: position q (n - 1) in the sorted values. Empty: NaN.
[[nodiscard]] double quantile_sorted(std::span<const double> sorted, double q) noexcept;
[[nodiscard]] double quantile(std::vector<double> values, double q);
[[nodiscard]] double median(std::vector<double> values);

} // namespace tonewalk
