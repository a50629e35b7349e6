// SPDX-License-Identifier: GPL-3.0-or-later
#include "carrier_tracks.hpp"

#include <algorithm>
#include <cmath>

namespace tonewalk {
namespace {

constexpr double drift_hz = 100.0;

bool shows_better(const found_carrier& a, const found_carrier& b) {
    return a.tones.empty() == b.tones.empty() ? a.level_dbfs > b.level_dbfs : !a.tones.empty();
}

} // namespace

/// Of those that this look has not met yet.
carrier_tracks::track* carrier_tracks::nearest(double offset_hz, std::size_t look) {
    track* best = nullptr;
    for (track& t : tracks_) {
        const double away_hz = std::abs(t.last_hz - offset_hz);
        const bool met = t.last_look == look;
        if (!met && away_hz < drift_hz &&
            (best == nullptr || away_hz < std::abs(best->last_hz - offset_hz))) {
            best = &t;
        }
    }
    return best;
}

void carrier_tracks::add(const std::vector<found_carrier>& carriers, std::size_t look) {
    for (const found_carrier& c : carriers) {
        track* const known = nearest(c.offset_hz, look);
        if (known == nullptr) {
            tracks_.push_back({c, look, c.offset_hz, look});
            continue;
        }
        known->last_hz = c.offset_hz;
        known->last_look = look;
        if (shows_better(c, known->carrier)) {
            known->carrier = c;
            known->look = look;
        }
    }
}

std::vector<carrier_tracks::track> carrier_tracks::strongest_first() const {
    std::vector<track> sorted = tracks_;
    std::stable_sort(sorted.begin(), sorted.end(), [](const track& a, const track& b) {
        return a.carrier.level_dbfs > b.carrier.level_dbfs;
    });
    return sorted;
}

} // namespace tonewalk
