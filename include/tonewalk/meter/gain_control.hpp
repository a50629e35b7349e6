// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <string>

#include "tonewalk/base/estimate.hpp"
#include "tonewalk/base/note.hpp"
#include "tonewalk/base/sheet.hpp"
#include "tonewalk/meter/level_log.hpp"

namespace tonewalk {

/// What carrier and noise together say of the receiver's gain: a gain that moves takes the noise
/// with it, a field that moves does not. Thresholds in docs/results.md.
struct gain_control_result {
    bool judged = false;    ///< false: `evidence` says what was missing
    bool suspected = false; ///< the noise falls as the carrier rises
    std::string evidence;
    double carrier_range_db = not_measured; ///< between 2 and 98 % of the records
    double noise_rise_db = not_measured;    ///< as the carrier falls through that range
    double step_db = not_measured;          ///< by which carrier and noise step together; NaN: none
    double step_s = not_measured;           ///< when
    note_set doubts;                        ///< agc-suspected or gain-step
};
/// `compressed`: the receiver is known to squeeze strong signals, which looks like gain control.
[[nodiscard]] gain_control_result judge_gain_control(const level_log&, bool compressed = false);
/// suspected (null when not judged), evidence.
[[nodiscard]] sheet describe(const gain_control_result&);

} // namespace tonewalk
