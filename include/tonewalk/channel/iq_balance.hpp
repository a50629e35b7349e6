// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <complex>

#include "tonewalk/base/estimate.hpp"
#include "tonewalk/base/sample.hpp"
#include "tonewalk/base/sheet.hpp"

namespace tonewalk {

/// How unequal a receiver treats I and Q. A line at f then has an image at -f: what is recorded is
/// z = s + k conj(s), k being `image_ratio`.
struct iq_balance {
    cf64 image_ratio;
    double image_ratio_u95 = not_measured;   ///< of either component
    double gain_error_db = not_measured;     ///< 20 log gI/gQ
    double gain_error_db_u95 = not_measured; ///< half-width of the 95 % interval
    double phase_error_deg = not_measured;   ///< e in I = cos, Q = sin(wt + e)
    double phase_error_deg_u95 = not_measured;

    /// The largest image over its signal that the fit allows, in amplitude.
    [[nodiscard]] double image_bound() const noexcept {
        return std::abs(image_ratio) + image_ratio_u95;
    }
};

/// Gain and phase from the image: e^(-j e) gQ/gI = (1 - k)/(1 + k). |k| below 1.
[[nodiscard]] iq_balance balance_from_image(cf64 image_ratio, double image_ratio_u95) noexcept;

/// iq_gain_error_db and iq_phase_error_deg, each with _u95.
[[nodiscard]] sheet describe(const iq_balance&);

} // namespace tonewalk
