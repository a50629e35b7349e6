// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <optional>

#include "tonewalk/scene/scene.hpp"

namespace tonewalk {

/// Where a carrier stands while the receiver is tuned to some centre.
struct carrier_tuning {
    double offset_hz = 0.0;    ///< from that centre
    double frequency_hz = 0.0; ///< absolute; 0 where no centre is known
};
/// Nothing where the carrier with its sidebands does not fit into the recorded band.
[[nodiscard]] std::optional<carrier_tuning> tuned(const scene&, const scene_carrier&,
                                                  std::optional<double> centre_hz);

/// The farthest sideband line that the modulation names, Hz.
[[nodiscard]] double farthest_sideband_hz(const scene_carrier&);

/// From the first stored sample to the last, lost ones included, s.
[[nodiscard]] double scene_span_s(const scene&);

} // namespace tonewalk
