// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>

#include "am_lines.hpp"

namespace tonewalk {

/// Where the tone lies, from both its lines in all records together, each against its noise.
class tone_place {
public:
    explicit tone_place(double window_s) : window_s_{window_s} {}
    void add(const three_lines&, const power_bend&, double line_noise) noexcept;
    /// How far the tone is off where it was read; 0 where its lines hardly stand out.
    [[nodiscard]] double shift_hz() const;

private:
    double window_s_;
    double records_ = 0.0;
    double evidence_ = 0.0;           // line powers over noise
    double slope_ = 0.0, bend_ = 0.0; // of those powers
};

} // namespace tonewalk
