// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <limits>

namespace tonewalk {

inline constexpr double not_measured =
    std::numeric_limits<double>::quiet_NaN(); ///< null in every output

/// A value with a symmetric 95 % interval, value ± u95, both in the unit that the name states.
struct estimate {
    double value = not_measured;
    double u95 = not_measured;
};

/// A value with a 95 % interval that need not be symmetric. low95 is NaN where nothing bounds it
/// below (floor-limited: value NaN too, high95 the bound); u95 is NaN where the interval is not
/// symmetric.
struct interval_estimate {
    double value = not_measured;
    double low95 = not_measured;
    double high95 = not_measured;
    double u95 = not_measured;
};

} // namespace tonewalk
