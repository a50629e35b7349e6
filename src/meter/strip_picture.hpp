// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <span>
#include <vector>

#include "noise_lines.hpp"
#include "tonewalk/base/sheet.hpp"

namespace tonewalk {

/// Power of the channel against time and frequency, small whatever the recording's length: at most
/// 240 rows of time, pairs of which are pooled whenever they would not suffice, and 128 columns of
/// frequency.
class strip_picture {
public:
    strip_picture(double width_hz, double carrier_offset_hz);
    void add(double time_s, std::span<const float> noise_powers, double bin_hz,
             std::span<const fitted_line>);
    [[nodiscard]] curve
    result() const; ///< x Hz from the centre, y s, z dBFS in one cell, row by row

private:
    struct row {
        double time_sum = 0.0, records = 0.0;
        std::vector<double> power; // sums
    };
    void pool();
    [[nodiscard]] std::size_t column_of(double hz) const noexcept;
    double width_hz_, carrier_offset_hz_;
    std::size_t records_a_row_ = 1;
    std::vector<row> rows_;
};

} // namespace tonewalk
