// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <optional>
#include <span>
#include <vector>

namespace tonewalk {

/// A weighted linear least-squares fit of y = design x coefficients.
struct linear_fit {
    std::vector<double> coefficients;
    std::vector<double> covariance; ///< columns x columns, row by row, as the sigmas given say
    double chi_square = 0.0;        ///< squares of (residual / sigma), summed
    std::size_t degrees = 0;        ///< of freedom: rows less columns

    [[nodiscard]] double covariance_of(std::size_t a, std::size_t b) const noexcept {
        return covariance[a * coefficients.size() + b];
    }
    [[nodiscard]] double sigma_of(std::size_t column) const noexcept;
};

/// `design` holds y.size() rows of equal length, one after another; `sigmas` the standard
/// deviations of y, > 0 (empty: 1 each). Columns of very different size are balanced inside.
/// Nothing where the columns do not determine the coefficients. Cost rows x columns^2.
[[nodiscard]] std::optional<linear_fit> fit_linear(std::span<const double> design,
                                                   std::span<const double> y,
                                                   std::span<const double> sigmas = {});

} // namespace tonewalk
