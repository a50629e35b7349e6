// SPDX-License-Identifier: GPL-3.0-or-later
#include "tone_place.hpp"

#include <cmath>

namespace tonewalk {

void tone_place::add(const three_lines& lines, const power_bend& bend, double line_noise) noexcept {
    slope_ += bend.slope / line_noise;
    bend_ += bend.bend / line_noise;
    evidence_ += (std::norm(lines.upper) + std::norm(lines.lower)) / line_noise - 2.0;
    records_ += 1.0;
}

double tone_place::shift_hz() const {
    constexpr double least_evidence = 20.0, sigmas = 5.0;
    const double scatter = std::sqrt(2.0 * records_);
    if (evidence_ < least_evidence + sigmas * scatter || bend_ >= 0.0) {
        return 0.0;
    }
    return hann_offset_bins(-slope_ / bend_ * window_s_) / window_s_;
}

} // namespace tonewalk
