// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <array>

#include "tonewalk/base/sheet.hpp"
#include "tonewalk/meter/level_log.hpp"

namespace tonewalk {

/// Part of a recording in which the antenna stood at a steady reference, seconds from the
/// recording's first sample.
struct reference_span {
    double from_s = 0.0, until_s = 0.0;
};

/// The carrier's level at the reference, before and after: what transmitter and receiver drifted by
/// meanwhile.
struct reference_drift {
    std::array<estimate, 2> level_dbfs; ///< mean of linear power, its u95 from the records' scatter
    estimate drift_db;                  ///< second less first
};

/// Takes the drift off every level of the log, along a straight line in decibels between the
/// middles of the two spans and level beyond them, so that all levels are those at the first
/// reference; the depth stays. Half the drift, and what noise leaves unknown of it, joins every
/// level's interval. The spans ascend and do not overlap. Throws error{malformed} naming
/// --reference where one holds fewer than two whole records that detect the carrier.
reference_drift remove_drift(level_log&, const std::array<reference_span, 2>&);

/// first_dbfs, second_dbfs, drift_db, each with _u95.
[[nodiscard]] sheet describe(const reference_drift&);

} // namespace tonewalk
