// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <optional>

#include "tonewalk/recording/stream.hpp"

namespace tonewalk {

/// One channel to be taken from a recording.
struct channel_plan {
    double carrier_hz = 0.0; ///< offset from the centre, or absolute
    bool absolute = false;   ///< absolute: followed through segments of other centres
    double width_hz = 0.0;   ///< flat width, both sides together, > 0
};

/// Where the carrier lies in a stretch, Hz from its centre. Nothing where the stretch's band does
/// not hold |offset| + width/2 (complex: within ±rate/2; real: within 0..rate/2).
[[nodiscard]] std::optional<double> offset_in(const channel_plan&, const stream_facts&,
                                              const stretch_facts&) noexcept;

} // namespace tonewalk
