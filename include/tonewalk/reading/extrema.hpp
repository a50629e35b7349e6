// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <vector>

#include "tonewalk/base/note.hpp"
#include "tonewalk/base/sheet.hpp"
#include "tonewalk/meter/level_log.hpp"

namespace tonewalk {

enum class extremum_kind { peak, null };

/// A turn of the level that noise cannot explain.
struct extremum {
    extremum_kind kind = extremum_kind::peak;
    double time_s = 0.0;
    double time_s_u95 = not_measured;
    interval_estimate level_dbfs; ///< floor-limited: value null, high95 its bound
    double prominence_db =
        0.0; ///< smaller difference to the neighbouring opposite extrema, or the log's ends
    bool floor_limited = false;    ///< noise or window set the depth
    double width_s = not_measured; ///< of a null, 6 dB above its bottom
    bool window_bound = false;     ///< narrower there than 6 windows
};

struct extrema_result {
    std::vector<extremum> found; ///< in time
    note_set doubts;             ///< window-bound
};

struct extrema_rule {
    double least_ratio = 1.413; ///< of amplitudes, 3 dB; 1: significance alone
};

/// Peaks and nulls of a level log (docs/measurements.md, "Extrema"): a walk with hysteresis in
/// linear amplitude, each stretch anew; places from parabolas in power.
[[nodiscard]] extrema_result find_extrema(const level_log&, quantity, const extrema_rule& = {});
[[nodiscard]] sheet_table describe(const extrema_result&); ///< outlives the result

} // namespace tonewalk
