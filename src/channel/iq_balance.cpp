// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/channel/iq_balance.hpp"

#include <cmath>
#include <numbers>

#include "tonewalk/base/decibel.hpp"

namespace tonewalk {

iq_balance balance_from_image(cf64 image_ratio, double image_ratio_u95) noexcept {
    constexpr double deg_per_rad = 180.0 / std::numbers::pi;
    const double db_per_neper = 20.0 / std::log(10.0);
    const cf64 q_over_i = (1.0 - image_ratio) / (1.0 + image_ratio);
    // d ln((1 - k)/(1 + k)) = -2 dk/(1 - k^2), alike in every direction of dk.
    const double relative_u95 = 2.0 * image_ratio_u95 / std::abs(1.0 - image_ratio * image_ratio);
    return {.image_ratio = image_ratio,
            .image_ratio_u95 = image_ratio_u95,
            .gain_error_db = -decibel::from_amplitude_ratio(std::abs(q_over_i)).db(),
            .gain_error_db_u95 = db_per_neper * relative_u95,
            .phase_error_deg = -deg_per_rad * std::arg(q_over_i),
            .phase_error_deg_u95 = deg_per_rad * relative_u95};
}

sheet describe(const iq_balance& b) {
    sheet s;
    s.add("iq_gain_error_db", "dB", estimate{b.gain_error_db, b.gain_error_db_u95});
    s.add("iq_phase_error_deg", "deg", estimate{b.phase_error_deg, b.phase_error_deg_u95});
    return s;
}

} // namespace tonewalk
