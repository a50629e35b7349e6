// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/channel/plan.hpp"

#include <cmath>

namespace tonewalk {

std::optional<double> offset_in(const channel_plan& plan, const stream_facts& facts,
                                const stretch_facts& stretch) noexcept {
    if (plan.absolute && !stretch.centre_hz) {
        return std::nullopt;
    }
    const double offset_hz = plan.absolute ? plan.carrier_hz - *stretch.centre_hz : plan.carrier_hz;
    const double half_width_hz = plan.width_hz / 2.0;
    constexpr double rounding = 1.0 + 1e-12; // of a width made to fit the band
    const double band_edge_hz = facts.sample_rate_hz / 2.0 * rounding;
    const bool below_top = std::abs(offset_hz) + half_width_hz <= band_edge_hz;
    const bool above_zero = facts.format.is_complex || offset_hz * rounding >= half_width_hz;
    return below_top && above_zero ? std::optional<double>{offset_hz} : std::nullopt;
}

} // namespace tonewalk
