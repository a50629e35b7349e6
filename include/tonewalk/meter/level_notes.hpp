// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include "tonewalk/meter/level_log.hpp"

namespace tonewalk {

/// Doubts that the finished log itself raises: weak-carrier, weak-tone, floor-limited,
/// segments-skipped, envelope-suppressed, depth-varies, gain-step, agc-suspected. Thresholds in
/// docs/results.md.
struct level_note_options {
    bool compressed = false; ///< the receiver is known to squeeze strong signals
    bool heard = false; ///< the log only goes with audio: no bounds are shown, no window chosen
};
void add_level_notes(level_log&, quantity, const level_note_options& = {});

} // namespace tonewalk
