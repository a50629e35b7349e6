// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include "level_pairs.hpp"

namespace tonewalk {

/// A step of the receiver's gain moves carrier and noise together by the same amount within one
/// window.
struct gain_step {
    double db = 0.0, time_s = 0.0, sigmas = 0.0; // sigmas: of the noise's step alone
};
/// The one that stands out most; 0 sigmas where there is none. `inflation` as in noise_means.
[[nodiscard]] gain_step find_gain_step(const std::vector<level_pair>&, const level_log&,
                                       double inflation);

} // namespace tonewalk
