// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/maths/cramer_rao.hpp"

#include <cmath>
#include <numbers>

namespace tonewalk {

tone_bound complex_tone_bound(double power_ratio, std::size_t samples, double rate_hz) noexcept {
    const double n = static_cast<double>(samples);
    tone_bound bound;
    bound.frequency_hz =
        rate_hz / (2.0 * std::numbers::pi) * std::sqrt(6.0 / (power_ratio * n * (n * n - 1.0)));
    bound.relative_amplitude = std::sqrt(1.0 / (2.0 * power_ratio * n));
    bound.first_phase_rad = std::sqrt((2.0 * n - 1.0) / (power_ratio * n * (n + 1.0)));
    bound.middle_phase_rad = bound.relative_amplitude;
    return bound;
}

tone_bound real_tone_bound(double power_ratio, std::size_t samples, double rate_hz) noexcept {
    // A real tone shares the same noise between two lines: half the information.
    return complex_tone_bound(power_ratio / 2.0, samples, rate_hz);
}

} // namespace tonewalk
