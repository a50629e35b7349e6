// SPDX-License-Identifier: GPL-3.0-or-later
#include "frequency_curve.hpp"

#include <algorithm>
#include <cmath>

#include "tonewalk/maths/quantile.hpp"

namespace tonewalk {
namespace {

constexpr double knot_s = 5.0;

struct straight_line {
    double hz = 0.0, slope_hz_s = 0.0; // at the knot
};

struct weighted_point {
    double t = 0.0, hz = 0.0, weight = 0.0;
};

/// Weighted least squares; a mean where the points hardly spread in time.
straight_line fit(const std::vector<weighted_point>& points) {
    double w = 0, wt = 0, wf = 0;
    for (const weighted_point& p : points) {
        w += p.weight;
        wt += p.weight * p.t;
        wf += p.weight * p.hz;
    }
    const double mean_t = wt / w, mean_f = wf / w;
    double tt = 0, tf = 0;
    for (const weighted_point& p : points) {
        tt += p.weight * (p.t - mean_t) * (p.t - mean_t);
        tf += p.weight * (p.t - mean_t) * (p.hz - mean_f);
    }
    constexpr double least_spread_s2 = 0.25;
    const double slope = tt / w > least_spread_s2 ? tf / tt : 0.0;
    return {mean_f - slope * mean_t, slope};
}

/// The fit again with far points weighed down (Tukey's biweight), until outliers have no say.
straight_line robust_fit(std::vector<weighted_point> points) {
    constexpr int rounds = 4;
    constexpr double tukey = 6.0; // median deviations
    const std::vector<weighted_point> given = points;
    straight_line line = fit(points);
    for (int round = 0; round < rounds && given.size() > 3; ++round) {
        std::vector<double> deviations;
        deviations.reserve(given.size());
        for (const weighted_point& p : given) {
            deviations.push_back(std::abs(p.hz - line.hz - line.slope_hz_s * p.t));
        }
        const double scale = tukey * median(deviations);
        if (scale <= 0.0) {
            return line;
        }
        for (std::size_t k = 0; k < given.size(); ++k) {
            const double u = deviations[k] / scale;
            points[k].weight = u < 1.0 ? given[k].weight * (1.0 - u * u) * (1.0 - u * u) : 0.0;
        }
        line = fit(points);
    }
    return line;
}

} // namespace

void frequency_curve::add(const frequency_reading& reading) {
    readings_.push_back(reading);
    if (reading.weight <= 0.0) {
        return;
    }
    constexpr double memory_s = 0.5;
    if (is_fresh(reading.time_s)) {
        const double share = std::min(1.0, (reading.time_s - *last_reading_s_) / memory_s);
        *provisional_hz_ += share * (reading.hz - *provisional_hz_);
    } else {
        provisional_hz_ = reading.hz;
    }
    last_reading_s_ = reading.time_s;
}

bool frequency_curve::is_fresh(double time_s) const noexcept {
    return last_reading_s_ && time_s - *last_reading_s_ <= knot_s;
}

double frequency_curve::known_until_s() const noexcept {
    return knots_.empty() ? 0.0 : knots_.back().time_s;
}

void frequency_curve::advance(double time_s) {
    for (;;) {
        const double next = knots_.empty() ? 0.0 : knots_.back().time_s + knot_s;
        if (time_s <= next + knot_s) {
            return;
        }
        make_knot(next);
        // Across a gap without readings the value is held from one knot to another, however long it
        // lasts.
        const double before_end_s = std::floor((time_s - knot_s) / knot_s) * knot_s;
        if (readings_.empty() && before_end_s > next + knot_s) {
            make_knot(before_end_s - knot_s);
        }
    }
}

void frequency_curve::make_knot(double time_s) {
    while (!readings_.empty() && readings_.front().time_s <= time_s - knot_s) {
        readings_.pop_front();
    }
    std::vector<weighted_point> points;
    std::size_t records = 0;
    for (const frequency_reading& r : readings_) {
        const double t = r.time_s - time_s;
        const double nearness = 1.0 - std::abs(t) / knot_s;
        records += nearness > 0.0 ? 1U : 0U;
        if (nearness > 0.0 && r.weight > 0.0) {
            points.push_back({t, r.hz, r.weight * nearness});
        }
    }
    // A lone record among weak ones may have been lifted over 20 dB by noise alone.
    constexpr std::size_t least = 3;
    if (points.empty() || points.size() < std::min(least, records)) {
        const double unknown_hz =
            any_ ? steepest_hz_s_ * (time_s - last_fitted_s_) : opening_unknown_hz_;
        knots_.push_back({time_s, last_hz_, unknown_hz});
        return;
    }
    const straight_line line = robust_fit(points);
    steepest_hz_s_ = std::max(steepest_hz_s_, std::abs(line.slope_hz_s));
    if (!any_) {
        begin_with(line.hz, line.slope_hz_s, time_s + points.front().t);
    }
    any_ = true;
    last_hz_ = line.hz;
    last_fitted_s_ = time_s + points.back().t;
    knots_.push_back({time_s, line.hz, 0.0});
}

/// Before the first reading, its value; how far that is off, its slope tells.
void frequency_curve::begin_with(double hz, double slope_hz_s, double first_reading_s) {
    for (knot& k : knots_) {
        k.hz = hz;
        k.unknown_hz = std::abs(slope_hz_s) * std::max(0.0, first_reading_s - k.time_s);
    }
}

frequency_curve::value frequency_curve::at(double time_s) const noexcept {
    if (knots_.empty()) {
        return {provisional_hz(), 0.0, last_reading_s_ ? 0.0 : opening_unknown_hz_};
    }
    const auto after = std::upper_bound(knots_.begin(), knots_.end(), time_s,
                                        [](double t, const knot& k) { return t < k.time_s; });
    if (after == knots_.end()) {
        return {knots_.back().hz, 0.0, knots_.back().unknown_hz};
    }
    if (after == knots_.begin()) {
        return {after->hz, 0.0, after->unknown_hz};
    }
    const knot& left = *(after - 1);
    const double share = (time_s - left.time_s) / (after->time_s - left.time_s);
    return {left.hz + share * (after->hz - left.hz),
            (after->hz - left.hz) / (after->time_s - left.time_s),
            std::max(left.unknown_hz, after->unknown_hz)};
}

} // namespace tonewalk
