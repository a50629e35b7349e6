// SPDX-License-Identifier: GPL-3.0-or-later
#include "reference_lines.hpp"

#include <algorithm>

namespace tonewalk {
namespace {

constexpr std::size_t far_bins = 2 * lobe_bins; // no lobe meets that of DC
constexpr std::size_t most_lines = 8;
const double least_over_mirror = decibel::from_db(10.0).power_ratio();
const double least_over_noise = decibel::from_db(20.0).power_ratio();

std::size_t distance(std::size_t a, std::size_t b) noexcept {
    return a > b ? a - b : b - a;
}

} // namespace

reference_lines::reference_lines(const line_spectrum& survey) : survey_{survey} {
    for (std::size_t k = far_bins; k + far_bins < survey.size(); ++k) {
        if (survey.is_line(k) && distance(k, survey.size() / 2) > 1) { // not DC itself
            lines_.push_back(k);
        }
    }
    std::sort(lines_.begin(), lines_.end(),
              [&](std::size_t a, std::size_t b) { return survey_.power(a) > survey_.power(b); });
    for (const std::size_t k : lines_) {
        if (chosen_.size() < most_lines && is_strong(k) && is_alone(mirror(k)) &&
            !is_sideband(mirror(k))) {
            chosen_.push_back(k);
        }
    }
}

bool reference_lines::has_strongest() const noexcept {
    return lines_.empty() || (!chosen_.empty() && chosen_.front() == lines_.front());
}

bool reference_lines::is_strong(std::size_t k) const {
    return distance(k, survey_.size() / 2) >= far_bins &&
           survey_.power(k) > least_over_mirror * survey_.power(mirror(k)) &&
           survey_.power(k) > least_over_noise * survey_.noise(mirror(k));
}

/// No other line leaks into this place.
bool reference_lines::is_alone(std::size_t place) const {
    const double most = std::max(survey_.power(place), line_ratio * survey_.noise(place));
    const std::size_t first = place > far_bins ? place - far_bins : 0;
    const std::size_t last = std::min(place + far_bins, survey_.size() - 1);
    for (std::size_t b = first; b <= last; ++b) {
        if (distance(b, place) > 1 && survey_.power(b) > most) {
            return false;
        }
    }
    return true;
}

/// The line at this place has a partner on the other side of a stronger one, which is no image
/// itself.
bool reference_lines::is_sideband(std::size_t place) const {
    return survey_.is_line(place) &&
           std::any_of(lines_.begin(), lines_.end(), [&](std::size_t carrier) {
               return survey_.power(carrier) > survey_.power(place) && !is_image(carrier) &&
                      has_partner(place, carrier);
           });
}

bool reference_lines::has_partner(std::size_t place, std::size_t carrier) const {
    const std::size_t twice = 2 * carrier;
    if (twice < place + 1 || twice - place + 1 >= survey_.size()) {
        return false;
    }
    for (std::size_t b = twice - place - 1; b <= twice - place + 1; ++b) {
        const double ratio = survey_.power(b) / survey_.power(place);
        if (survey_.is_line(b) && ratio < mirror_ratio && ratio * mirror_ratio > 1.0) {
            return true;
        }
    }
    return false;
}

bool reference_lines::is_image(std::size_t k) const {
    return survey_.power(mirror(k)) > least_over_mirror * survey_.power(k);
}

} // namespace tonewalk
