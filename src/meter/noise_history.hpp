// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstdint>
#include <deque>

#include "noise_lines.hpp"

namespace tonewalk {

/// Noise readings of the records of the last 20 s, so that a record with few lines of its own can
/// borrow from its neighbours in the stretch.
class noise_history {
public:
    static constexpr double reach_s = 10.0; ///< of borrowing, either way
    /// Independent lines that a record wants.
    static constexpr double least_independent = 16.0;

    explicit noise_history(double window_s) : window_s_{window_s} {}
    void add(double time_s, std::uint32_t stretch, const noise_reading&);
    /// The reading of the record at `time_s`; where it has too few lines, the nearest others join,
    /// as few as do, each a window from every other so that they are independent.
    [[nodiscard]] noise_reading at(double time_s, std::uint32_t stretch) const;

private:
    struct entry {
        double time_s = 0.0;
        std::uint32_t stretch = 0;
        noise_reading noise;
    };
    double window_s_;
    std::deque<entry> entries_; // ascending time
};

} // namespace tonewalk
