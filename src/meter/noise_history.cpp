// SPDX-License-Identifier: GPL-3.0-or-later
#include "noise_history.hpp"

#include <algorithm>

namespace tonewalk {

void noise_history::add(double time_s, std::uint32_t stretch, const noise_reading& noise) {
    entries_.push_back({time_s, stretch, noise});
    while (entries_.front().time_s < time_s - 2.0 * reach_s) {
        entries_.pop_front();
    }
}

noise_reading noise_history::at(double time_s, std::uint32_t stretch) const {
    const auto own = std::lower_bound(entries_.begin(), entries_.end(), time_s,
                                      [](const entry& e, double t) { return e.time_s < t; });
    noise_reading total{own->noise.mean_power * own->noise.independent, own->noise.independent};
    const double apart_s = 0.999 * window_s_;
    double earliest_s = time_s, latest_s = time_s; // of those that joined
    auto before = own, after = own;
    // The next on each side that is a window away from those that joined on it.
    const auto step_back = [&] {
        while (before != entries_.begin() && earliest_s - before->time_s <= apart_s) {
            --before;
        }
        return before->stretch == stretch && earliest_s - before->time_s > apart_s &&
               time_s - before->time_s <= reach_s;
    };
    const auto step_on = [&] {
        while (after != entries_.end() && after->time_s - latest_s <= apart_s) {
            ++after;
        }
        return after != entries_.end() && after->stretch == stretch &&
               after->time_s - time_s <= reach_s;
    };
    while (total.independent < least_independent) {
        const bool back = step_back(), on = step_on();
        if (!back && !on) {
            break;
        }
        const bool take_earlier =
            back && (!on || time_s - before->time_s <= after->time_s - time_s);
        const entry& joins = take_earlier ? *before : *after;
        (take_earlier ? earliest_s : latest_s) = joins.time_s;
        total.mean_power += joins.noise.mean_power * joins.noise.independent;
        total.independent += joins.noise.independent;
    }
    total.mean_power /= std::max(1.0, total.independent);
    return total;
}

} // namespace tonewalk
