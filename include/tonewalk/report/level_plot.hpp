// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <string>
#include <vector>

namespace tonewalk {

/// A level against time, drawn in plain characters.
struct level_plot {
    std::string title;          ///< "tone level, dBFS"
    std::vector<double> time_s; ///< ascending
    std::vector<double> level;  ///< dB; NaN where nothing was detected
    std::vector<double> bound;  ///< upper limit in dB where nothing was detected, else anything
    struct mark {
        double time_s = 0.0;
        char letter = 'P'; ///< 'P' stands above the line, 'N' below it
    };
    std::vector<mark> marks;
};

/// Lines of at most `columns` characters (at least 24), each ended by a line feed; empty where no
/// level and no bound is known. Each column shows all levels of its time from lowest to highest, so
/// that no null is lost; 'v' stands at the bound of what was not detected; the time axis is broken
/// where there are no records. The scale spans 2 dB at least, so that noise on a steady carrier is
/// not blown up.
[[nodiscard]] std::string draw(const level_plot&, int columns);

} // namespace tonewalk
