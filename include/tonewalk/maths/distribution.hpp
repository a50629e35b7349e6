// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

namespace tonewalk {

/// Quantiles and distribution functions; p is the probability below, 0 < p < 1.
[[nodiscard]] double normal_quantile(double p);
[[nodiscard]] double student_t_quantile(double p, double degrees);
[[nodiscard]] double chi_square_quantile(double p, double degrees);
[[nodiscard]] double chi_square_cdf(double x, double degrees);
[[nodiscard]] double f_quantile(double p, double degrees_above, double degrees_below);
/// P(X <= x) of the noncentral F distribution.
[[nodiscard]] double noncentral_f_cdf(double x, double degrees_above, double degrees_below,
                                      double noncentrality);
/// The noncentrality at which P(X <= x) = p; 0 where even 0 gives less than p.
[[nodiscard]] double noncentral_f_noncentrality(double x, double p, double degrees_above,
                                                double degrees_below);

} // namespace tonewalk
