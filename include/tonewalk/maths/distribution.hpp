// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

namespace tonewalk {

/// Standard errors on either side of a normal 95 % interval.
inline constexpr double two_sided_95 = 1.96;

/// Quantiles and distribution functions; p is the probability below, 0 < p < 1.
[[nodiscard]] double normal_quantile(double p);
[[nodiscard]] double student_t_quantile(double p, double degrees);
[[nodiscard]] double chi_square_quantile(double p, double degrees);
[[nodiscard]] double chi_square_cdf(double x, double degrees);
[[nodiscard]] double f_quantile(double p, double degrees_above, double degrees_below);
[[nodiscard]] double noncentral_chi_square_cdf(double x, double degrees, double noncentrality);

/// A line in noise of which only an estimate is known, from `noise_degrees` degrees of freedom.
/// P(power <= x) where power is the line's and the noise's together, in means of noise alone, and
/// `line` the line's power in variances of one of the `degrees` quadratures; both as if the
/// estimate were true. Without a line this is Fisher's F; for a strong one the amplitude follows
/// Student's t.
[[nodiscard]] double line_power_cdf(double x, double degrees, double noise_degrees, double line);
/// The line at which that probability is p; 0 where even no line gives less than p.
[[nodiscard]] double line_power_inverse(double x, double p, double degrees, double noise_degrees);

} // namespace tonewalk
