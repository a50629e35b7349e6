// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include "tonewalk/meter/level_log.hpp"

namespace tonewalk {

/// Doubts that the finished log itself raises: weak-carrier, weak-tone, floor-limited,
/// segments-skipped, envelope-suppressed, depth-varies, gain-step, agc-suspected. Thresholds in
/// docs/results.md.
/// `compressed`: the receiver is known to squeeze strong signals (compression_watch.hpp).
void add_level_notes(level_log&, quantity, bool compressed = false);

} // namespace tonewalk
