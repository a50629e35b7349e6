// SPDX-License-Identifier: GPL-3.0-or-later
#include "extremum_placer.hpp"

#include <algorithm>
#include <cmath>

#include "tonewalk/base/decibel.hpp"
#include "tonewalk/maths/distribution.hpp"
#include "tonewalk/maths/window.hpp"

namespace tonewalk {
namespace {

const double peak_reach = decibel::from_db(-1.0).power_ratio();
const double null_reach = decibel::from_db(6.0).power_ratio();
constexpr std::size_t least_fit_records = 5;
// Half a Hann window's mean square time is 0.0163 windows^2: a wave whose frequency is off the
// curve by f loses (2 pi f T)^2 times this of its amplitude. Nearly doubled, since the curve bends
// at nulls that lie further apart than its knots, and then stands outside the two waves'
// frequencies.
constexpr double hann_smear = 0.03;
// A standing wave is a sine's square in power, not a parabola: fitted over a rise R of a whole
// swing S, its vertex is off by R^2/(35 S) with even points, R^2/(20 S) at the most as records
// fall.
constexpr double parabola_error = 1.0 / 20.0;

double amplitude_db(double power) {
    return decibel::from_power_ratio(power).db();
}

/// Level and interval from a fitted power. `smear`: how far window and parabola may have moved its
/// amplitude, relative.
interval_estimate level_from(double power, double power_sigma, double smear) {
    interval_estimate level;
    const double reach = two_sided_95 * power_sigma + 2.0 * smear * std::max(0.0, power);
    level.high95 = amplitude_db(std::max(power, 0.0) + reach);
    if (power <= 0.0) {
        return level;
    }
    level.value = amplitude_db(power);
    level.low95 = power > reach ? amplitude_db(power - reach) : not_measured;
    constexpr double symmetric_share = 0.36; // of the power: 15 dB line SNR
    level.u95 = reach < symmetric_share * power ? 0.5 * (level.high95 - level.low95) : not_measured;
    return level;
}

} // namespace

extremum_placer::extremum_placer(std::span<const log_step> steps, const level_log& log,
                                 quantity which)
    : steps_{steps}, log_{&log}, window_s_{log.window_s},
      overlap_{hann_overlap_inflation(log.every_s / log.window_s).amplitude}, which_{which} {
    double lowest = steps_.empty() ? 0.0 : steps_.front().amplitude;
    for (const log_step& s : steps_) {
        highest_ = std::max(highest_, s.amplitude);
        lowest = std::min(lowest, s.amplitude);
    }
    swing_ = highest_ * highest_ - lowest * lowest;
}

/// The records about `place`, in a row, whose power stays above (or below) `limit`.
std::pair<std::size_t, std::size_t> extremum_placer::run_about(std::size_t place, double limit,
                                                               bool above, const reach& r) const {
    const auto inside = [&](std::size_t k) {
        return above ? steps_[k].power >= limit : steps_[k].power <= limit;
    };
    std::size_t first = place, last = place;
    while (first > r.first && inside(first - 1)) {
        --first;
    }
    while (last < r.last && inside(last + 1)) {
        ++last;
    }
    while (last - first + 1 < least_fit_records && (first > r.first || last < r.last)) {
        first -= first > r.first ? 1U : 0U;
        last += last < r.last ? 1U : 0U;
    }
    return {first, last};
}

/// The records about `place`, in a row, that are as undetected as it is; itself if it is detected.
std::pair<std::size_t, std::size_t> extremum_placer::undetected_about(std::size_t place,
                                                                      const reach& r) const {
    std::size_t first = place, last = place;
    while (last < r.last && !steps_[place].detected && !steps_[last + 1].detected) {
        ++last;
    }
    while (first > r.first && !steps_[place].detected && !steps_[first - 1].detected) {
        --first;
    }
    return {first, last};
}

std::optional<parabola_vertex> extremum_placer::vertex(std::size_t first, std::size_t last) const {
    std::vector<weighted_value> points;
    for (std::size_t k = first; k <= last; ++k) {
        const log_step& s = steps_[k];
        const double variance = s.sigma * s.sigma;
        const double power = std::max(0.0, s.power);
        points.push_back({s.record->time_s, s.power,
                          std::sqrt(4.0 * power * variance + 2.0 * variance * variance)});
    }
    // Weights from the points' own noisy powers would favour those that noise made small: use the
    // fit's.
    std::optional<parabola_vertex> fit = fit_parabola(points, overlap_);
    for (int round = 0; fit && round < 2; ++round) {
        for (std::size_t k = first; k <= last; ++k) {
            weighted_value& p = points[k - first];
            const double away = p.x - fit->x;
            const double power = std::max(0.0, fit->y + 0.5 * fit->bend * away * away);
            const double variance = steps_[k].sigma * steps_[k].sigma;
            p.sigma = std::sqrt(4.0 * power * variance + 2.0 * variance * variance);
        }
        fit = fit_parabola(points, overlap_);
    }
    return fit;
}

void extremum_placer::take_time(extremum& e, const std::optional<parabola_vertex>& fit,
                                std::size_t first, std::size_t last, std::size_t place) const {
    const double from_s = steps_[first].record->time_s, until_s = steps_[last].record->time_s;
    const bool right_way =
        fit && (e.kind == extremum_kind::peak ? fit->bend < 0.0 : fit->bend > 0.0);
    if (right_way && fit->x > from_s && fit->x < until_s) {
        e.time_s = fit->x;
        e.time_s_u95 = two_sided_95 * fit->x_sigma;
    } else { // no parabola: anywhere among them
        e.time_s = steps_[place].record->time_s;
        e.time_s_u95 = std::max(e.time_s - from_s, until_s - e.time_s);
    }
}

/// How far window and parabola may be off, relative in amplitude. Window: two waves A >= B against
/// each other lie (2 f) apart in frequency, the curve somewhere between; each loses (2 f T)^2
/// hann_smear at most. The parabola tells (2 f)^2 = bend / (2 A B), and the whole swing 4 A B.
double extremum_placer::shape_error(const parabola_vertex& fit, std::size_t first,
                                    std::size_t last) const noexcept {
    const double here = std::sqrt(std::max(fit.y, 0.0));
    if (here <= 0.0) {
        return 0.0;
    }
    const double stronger = fit.bend > 0.0 ? 0.5 * (highest_ + here) : here;
    const double window = swing_ > 0.0 ? hann_smear * window_s_ * window_s_ * 2.0 *
                                             std::abs(fit.bend) / swing_ * stronger / here
                                       : 0.0;
    const double reach_s =
        std::max(fit.x - steps_[first].record->time_s, steps_[last].record->time_s - fit.x);
    const double rise = 0.5 * std::abs(fit.bend) * reach_s * reach_s;
    return window + 0.5 * parabola_error * rise * rise / (std::max(rise, swing_) * fit.y);
}

/// Time over which the power stays below `level`, between straight lines through the records.
double extremum_placer::width_s(std::size_t place, double level) const {
    const auto crossing = [&](std::size_t inner, std::size_t outer) {
        const log_step &a = steps_[inner], &b = steps_[outer];
        const double share =
            std::clamp((level - a.power) / std::max(b.power - a.power, 1e-300), 0.0, 1.0);
        return a.record->time_s + share * (b.record->time_s - a.record->time_s);
    };
    if (steps_[place].power > level) {
        return 0.0;
    }
    std::size_t left = place, right = place;
    while (left > 0 && steps_[left].power <= level) {
        --left;
    }
    while (right + 1 < steps_.size() && steps_[right].power <= level) {
        ++right;
    }
    const double from_s =
        steps_[left].power > level ? crossing(left + 1, left) : steps_[left].record->time_s;
    const double until_s =
        steps_[right].power > level ? crossing(right - 1, right) : steps_[right].record->time_s;
    return until_s - from_s;
}

const interval_estimate& extremum_placer::level_near(double time_s) const noexcept {
    const auto apart = [time_s](const log_step& s) { return std::abs(s.record->time_s - time_s); };
    const auto best =
        std::min_element(steps_.begin(), steps_.end(),
                         [&](const log_step& a, const log_step& b) { return apart(a) < apart(b); });
    return level_of(*best->record, which_);
}

interval_estimate extremum_placer::level_of_fit(const parabola_vertex& fit, std::size_t first,
                                                std::size_t last) const {
    return with_common_doubts(level_from(fit.y, fit.y_sigma, shape_error(fit, first, last)), *log_,
                              which_);
}

extremum extremum_placer::peak_at(std::size_t place, const reach& r) const {
    extremum e;
    e.kind = extremum_kind::peak;
    const auto [first, last] = run_about(place, peak_reach * steps_[place].power, true, r);
    const auto fit = vertex(first, last);
    take_time(e, fit, first, last, place);
    const bool fitted = fit && fit->bend < 0.0 && fit->y > 0.0 && e.time_s == fit->x;
    e.level_dbfs =
        fitted ? level_of_fit(*fit, first, last) : level_of(*steps_[place].record, which_);
    return e;
}

extremum extremum_placer::null_at(std::size_t place, const reach& r) const {
    extremum e;
    e.kind = extremum_kind::null;
    const log_step& bottom = steps_[place];
    e.floor_limited = !bottom.detected;
    const auto [first, last] = undetected_about(place, r);
    const std::size_t middle = (first + last) / 2;
    const double bottom_power =
        e.floor_limited
            ? decibel::from_db(level_of(*steps_[middle].record, which_).high95).power_ratio()
            : std::max(bottom.power, bottom.sigma * bottom.sigma);
    const auto [from, until] = run_about(middle, null_reach * bottom_power, false, r);
    const auto fit = vertex(from, until);
    take_time(e, fit, from, until, middle);
    const bool fitted = fit && fit->bend > 0.0 && e.time_s == fit->x && !e.floor_limited;
    const interval_estimate& nearest = level_near(e.time_s);
    e.level_dbfs = fitted ? level_of_fit(*fit, from, until) : nearest;
    const double fitted_bottom =
        fitted ? std::max(fit->y, bottom.sigma * bottom.sigma) : bottom_power;
    const double edge = null_reach * fitted_bottom;
    e.width_s = fitted && steps_[middle].power > edge // it lies between two records
                    ? 2.0 * std::sqrt(2.0 * (edge - fit->y) / fit->bend)
                    : width_s(middle, edge);
    e.window_bound = e.width_s < least_null_windows * window_s_;
    if (e.window_bound) { // whichever of fit and record lets the null be less deep
        e.level_dbfs.high95 = std::fmax(e.level_dbfs.high95, nearest.high95);
    }
    e.floor_limited = e.floor_limited || e.window_bound || std::isnan(e.level_dbfs.value);
    if (e.floor_limited) {
        e.level_dbfs.value = e.level_dbfs.low95 = e.level_dbfs.u95 = not_measured;
    }
    return e;
}

} // namespace tonewalk
