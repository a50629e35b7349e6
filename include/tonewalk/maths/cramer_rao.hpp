// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>

namespace tonewalk {

/// The least standard deviations that any unbiased estimate of a single tone in white Gaussian
/// noise can have (D. C. Rife, R. R. Boorstyn, "Single-tone parameter estimation from discrete-time
/// observations", IEEE Trans. Inf. Theory 20(5), 1974; from memory, rederived).
struct tone_bound {
    double frequency_hz = 0.0;
    double relative_amplitude = 0.0;
    double first_phase_rad = 0.0;  ///< at the first sample
    double middle_phase_rad = 0.0; ///< in the middle of the record
};

/// b e^(j ...) in noise of variance s^2 a component: `power_ratio` = b^2 / (2 s^2).
[[nodiscard]] tone_bound complex_tone_bound(double power_ratio, std::size_t samples,
                                            double rate_hz) noexcept;
/// A cos(...) in noise of variance s^2: `power_ratio` = A^2 / (2 s^2). Holds for many periods, away
/// from 0 Hz and half the rate.
[[nodiscard]] tone_bound real_tone_bound(double power_ratio, std::size_t samples,
                                         double rate_hz) noexcept;

} // namespace tonewalk
