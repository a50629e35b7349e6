// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include "level_pairs.hpp"

namespace tonewalk {

/// Standard errors from which on a rise counts: a whole log is searched, 1.96 would find some
/// anywhere.
inline constexpr double noise_rise_sigmas = 5.0;

/// How the noise rises as the carrier falls.
struct noise_rise {
    double db = 0.0, sigmas = 0.0;
    double range_db = 0.0;   // of the carrier
    double visible_db = 0.0; // the least rise that would have been significant
};
/// A gain that follows the carrier all along, or that moves between two stops: what shows more.
[[nodiscard]] noise_rise find_noise_rise(std::vector<level_pair>, double inflation);

} // namespace tonewalk
