// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/reading/extrema.hpp"

#include <algorithm>
#include <cmath>
#include <memory>
#include <optional>
#include <span>

#include <fmt/core.h>

#include "tonewalk/base/decibel.hpp"
#include "tonewalk/maths/distribution.hpp"
#include "tonewalk/maths/parabola_fit.hpp"
#include "tonewalk/maths/quantile.hpp"
#include "tonewalk/maths/window.hpp"

namespace tonewalk {
namespace {

const double peak_reach = decibel::from_db(-1.0).power_ratio();
const double null_reach = decibel::from_db(6.0).power_ratio();
constexpr double least_null_windows = 6.0;
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

/// One record as the walk sees it; undetected records have amplitude 0.
struct step {
    const level_record* record = nullptr;
    double amplitude = 0.0, power = 0.0, sigma = 0.0;
    bool detected = false;
};

struct turn {
    std::size_t place = 0;
    extremum_kind kind = extremum_kind::peak;
};

class walk {
public:
    walk(std::vector<step> steps, double sigmas, const extrema_rule& rule, const level_log& log,
         quantity which)
        : steps_{std::move(steps)}, sigmas_{sigmas},
          least_ratio_{rule.least_ratio}, window_s_{log.window_s},
          overlap_{hann_overlap_inflation(log.every_s / log.window_s).amplitude}, which_{which} {
        lowest_ = steps_.empty() ? 0.0 : steps_.front().amplitude;
        for (const step& s : steps_) {
            highest_ = std::max(highest_, s.amplitude);
            lowest_ = std::min(lowest_, s.amplitude);
        }
    }
    [[nodiscard]] std::vector<extremum> extrema() const;

private:
    [[nodiscard]] bool differ(std::size_t higher, std::size_t lower) const noexcept;
    [[nodiscard]] std::vector<turn> turns() const;
    [[nodiscard]] extremum placed(const turn&) const;
    [[nodiscard]] extremum placed_peak(std::size_t place) const;
    [[nodiscard]] extremum placed_null(std::size_t place) const;
    [[nodiscard]] std::pair<std::size_t, std::size_t> run_about(std::size_t place, double limit,
                                                                bool above) const;
    [[nodiscard]] std::optional<parabola_vertex> vertex(std::size_t first, std::size_t last) const;
    void take_place(extremum&, const std::optional<parabola_vertex>&, std::size_t first,
                    std::size_t last, std::size_t place) const;
    [[nodiscard]] double width_s(std::size_t first, std::size_t last, double level) const;
    void set_prominence(std::vector<extremum>&, const std::vector<turn>&) const;
    [[nodiscard]] double shown_db(std::size_t place) const noexcept;
    [[nodiscard]] std::size_t nearest_to(double time_s) const noexcept;
    [[nodiscard]] double shape_error(const parabola_vertex&, std::size_t first,
                                     std::size_t last) const noexcept;

    std::vector<step> steps_;
    double sigmas_, least_ratio_, window_s_;
    double overlap_; // variance of a mean over that of as many independent records
    double highest_ = 0.0, lowest_ = 0.0;
    quantity which_;
};

bool walk::differ(std::size_t higher, std::size_t lower) const noexcept {
    const step &h = steps_[higher], &l = steps_[lower];
    return h.amplitude - sigmas_ * h.sigma > l.amplitude + sigmas_ * l.sigma &&
           h.amplitude >= least_ratio_ * std::max(l.amplitude, l.sigma);
}

/// Alternating turns, each significant on both sides; so the first and the last record are none.
std::vector<turn> walk::turns() const {
    std::vector<turn> found;
    std::size_t high = 0, low = 0;
    int direction = 0; // +1 rising: the high is open; -1 falling: the low is open
    const auto keep = [&](std::size_t place, extremum_kind kind) {
        bool turned = direction != 0; // the first turn: has the level come from somewhere else?
        for (std::size_t k = 0; k < place && !turned; ++k) {
            turned = kind == extremum_kind::peak ? differ(place, k) : differ(k, place);
        }
        if (turned) {
            found.push_back({place, kind});
        }
    };
    for (std::size_t k = 1; k < steps_.size(); ++k) {
        high = direction >= 0 && steps_[k].amplitude > steps_[high].amplitude ? k : high;
        low = direction <= 0 && steps_[k].amplitude < steps_[low].amplitude ? k : low;
        if (direction >= 0 && differ(high, k)) {
            keep(high, extremum_kind::peak);
            direction = -1;
            low = k;
        } else if (direction <= 0 && differ(k, low)) {
            keep(low, extremum_kind::null);
            direction = +1;
            high = k;
        }
    }
    return found;
}

/// The records about `place`, in a row, whose power stays above (or below) `limit`.
std::pair<std::size_t, std::size_t> walk::run_about(std::size_t place, double limit,
                                                    bool above) const {
    const auto inside = [&](std::size_t k) {
        return above ? steps_[k].power >= limit : steps_[k].power <= limit;
    };
    std::size_t first = place, last = place;
    while (first > 0 && inside(first - 1)) {
        --first;
    }
    while (last + 1 < steps_.size() && inside(last + 1)) {
        ++last;
    }
    while (last - first + 1 < least_fit_records && (first > 0 || last + 1 < steps_.size())) {
        first -= first > 0 ? 1U : 0U;
        last += last + 1 < steps_.size() ? 1U : 0U;
    }
    return {first, last};
}

std::optional<parabola_vertex> walk::vertex(std::size_t first, std::size_t last) const {
    std::vector<weighted_value> points;
    for (std::size_t k = first; k <= last; ++k) {
        const step& s = steps_[k];
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

void walk::take_place(extremum& e, const std::optional<parabola_vertex>& fit, std::size_t first,
                      std::size_t last, std::size_t place) const {
    const double from_s = steps_[first].record->time_s, until_s = steps_[last].record->time_s;
    const bool right_way =
        fit && (e.kind == extremum_kind::peak ? fit->bend < 0.0 : fit->bend > 0.0);
    if (right_way && fit->x > from_s && fit->x < until_s) {
        e.time_s = fit->x;
        e.time_s_u95 = 1.96 * fit->x_sigma;
    } else { // no parabola: anywhere among them
        e.time_s = steps_[place].record->time_s;
        e.time_s_u95 = std::max(e.time_s - from_s, until_s - e.time_s);
    }
}

double amplitude_db(double power) {
    return decibel::from_power_ratio(power).db();
}

/// Level and interval from a fitted power. `smear`: how far window and parabola may have moved its
/// amplitude, relative.
interval_estimate level_from(double power, double power_sigma, double smear) {
    interval_estimate level;
    const double reach = 1.96 * power_sigma + 2.0 * smear * std::max(0.0, power);
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

/// How far window and parabola may be off, relative in amplitude. Window: two waves A >= B against
/// each other lie (2 f) apart in frequency, the curve somewhere between; each loses (2 f T)^2
/// hann_smear at most. The parabola tells (2 f)^2 = bend / (2 A B), and the whole swing 4 A B.
double walk::shape_error(const parabola_vertex& fit, std::size_t first,
                         std::size_t last) const noexcept {
    const double here = std::sqrt(std::max(fit.y, 0.0));
    if (here <= 0.0) {
        return 0.0;
    }
    const double swing = highest_ * highest_ - lowest_ * lowest_;
    const double stronger = fit.bend > 0.0 ? 0.5 * (highest_ + here) : here;
    const double window = swing > 0.0 ? hann_smear * window_s_ * window_s_ * 2.0 *
                                            std::abs(fit.bend) / swing * stronger / here
                                      : 0.0;
    const double reach_s =
        std::max(fit.x - steps_[first].record->time_s, steps_[last].record->time_s - fit.x);
    const double rise = 0.5 * std::abs(fit.bend) * reach_s * reach_s;
    return window + 0.5 * parabola_error * rise * rise / (std::max(rise, swing) * fit.y);
}

extremum walk::placed_peak(std::size_t place) const {
    extremum e;
    e.kind = extremum_kind::peak;
    const auto [first, last] = run_about(place, peak_reach * steps_[place].power, true);
    const auto fit = vertex(first, last);
    take_place(e, fit, first, last, place);
    const bool fitted = fit && fit->bend < 0.0 && fit->y > 0.0 && e.time_s == fit->x;
    e.level_dbfs = fitted ? level_from(fit->y, fit->y_sigma, shape_error(*fit, first, last))
                          : level_of(*steps_[place].record, which_);
    return e;
}

/// Time over which the power stays below `level`, between straight lines through the records.
double walk::width_s(std::size_t first, std::size_t last, double level) const {
    const auto crossing = [&](std::size_t inner, std::size_t outer) {
        const step &a = steps_[inner], &b = steps_[outer];
        const double share =
            std::clamp((level - a.power) / std::max(b.power - a.power, 1e-300), 0.0, 1.0);
        return a.record->time_s + share * (b.record->time_s - a.record->time_s);
    };
    std::size_t left = first, right = last;
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

extremum walk::placed_null(std::size_t place) const {
    extremum e;
    e.kind = extremum_kind::null;
    std::size_t first = place, last = place;
    while (last + 1 < steps_.size() && !steps_[place].detected && !steps_[last + 1].detected) {
        ++last;
    }
    while (first > 0 && !steps_[place].detected && !steps_[first - 1].detected) {
        --first;
    }
    e.floor_limited = !steps_[place].detected;
    const std::size_t middle = (first + last) / 2;
    const step& bottom = steps_[place];
    const double bottom_power =
        e.floor_limited
            ? decibel::from_db(level_of(*steps_[middle].record, which_).high95).power_ratio()
            : std::max(bottom.power, bottom.sigma * bottom.sigma);
    const auto [from, until] = run_about(middle, null_reach * bottom_power, false);
    const auto fit = vertex(from, until);
    take_place(e, fit, from, until, middle);
    const bool fitted = fit && fit->bend > 0.0 && e.time_s == fit->x && !e.floor_limited;
    const interval_estimate& nearest = level_of(*steps_[nearest_to(e.time_s)].record, which_);
    e.level_dbfs =
        fitted ? level_from(fit->y, fit->y_sigma, shape_error(*fit, from, until)) : nearest;
    e.floor_limited = e.floor_limited || std::isnan(e.level_dbfs.value);
    const double fitted_bottom =
        fitted ? std::max(fit->y, bottom.sigma * bottom.sigma) : bottom_power;
    e.window_bound =
        width_s(middle, middle, null_reach * fitted_bottom) < least_null_windows * window_s_;
    if (e.window_bound) { // whichever of fit and record lets the null be less deep
        e.floor_limited = true;
        e.level_dbfs.high95 = std::fmax(e.level_dbfs.high95, nearest.high95);
    }
    if (e.floor_limited) {
        e.level_dbfs.value = e.level_dbfs.low95 = e.level_dbfs.u95 = not_measured;
    }
    return e;
}

std::size_t walk::nearest_to(double time_s) const noexcept {
    const auto apart = [time_s](const step& s) { return std::abs(s.record->time_s - time_s); };
    const auto best =
        std::min_element(steps_.begin(), steps_.end(),
                         [&](const step& a, const step& b) { return apart(a) < apart(b); });
    return static_cast<std::size_t>(best - steps_.begin());
}

extremum walk::placed(const turn& t) const {
    return t.kind == extremum_kind::peak ? placed_peak(t.place) : placed_null(t.place);
}

double walk::shown_db(std::size_t place) const noexcept {
    const interval_estimate& level = level_of(*steps_[place].record, which_);
    return std::isnan(level.value) ? level.high95 : level.value;
}

void walk::set_prominence(std::vector<extremum>& all, const std::vector<turn>& at) const {
    const auto extremum_db = [](const extremum& e) {
        return std::isnan(e.level_dbfs.value) ? e.level_dbfs.high95 : e.level_dbfs.value;
    };
    // Towards an end of the log without a turn: the record there that is furthest the other way.
    const auto furthest = [&](std::size_t from, std::size_t until, extremum_kind kind) {
        double best = shown_db(from);
        for (std::size_t k = from; k <= until; ++k) {
            best = kind == extremum_kind::peak ? std::min(best, shown_db(k))
                                               : std::max(best, shown_db(k));
        }
        return best;
    };
    for (std::size_t k = 0; k < all.size(); ++k) {
        const double left = k > 0 ? extremum_db(all[k - 1]) : furthest(0, at[k].place, all[k].kind);
        const double right = k + 1 < all.size()
                                 ? extremum_db(all[k + 1])
                                 : furthest(at[k].place, steps_.size() - 1, all[k].kind);
        const double own = extremum_db(all[k]);
        all[k].prominence_db = std::min(std::abs(own - left), std::abs(own - right));
    }
}

std::vector<extremum> walk::extrema() const {
    std::vector<extremum> all;
    const std::vector<turn> at = turns();
    all.reserve(at.size());
    for (const turn& t : at) {
        all.push_back(placed(t));
    }
    set_prominence(all, at);
    return all;
}

std::vector<step> steps_of(std::span<const level_record> records, quantity which) {
    std::vector<step> steps;
    for (const level_record& r : records) {
        const line_power& line = line_of(r, which);
        if (!std::isnan(line.power)) {
            const double amplitude = line.detected ? std::sqrt(std::max(0.0, line.power)) : 0.0;
            steps.push_back({&r, amplitude, line.power, line.sigma, line.detected});
        }
    }
    // A record's own noise may rest on few lines and then comes out far too small now and then:
    // what the records usually have is the least.
    std::vector<double> sigmas;
    sigmas.reserve(steps.size());
    for (const step& each : steps) {
        sigmas.push_back(each.sigma);
    }
    const double usual = median(std::move(sigmas));
    for (step& each : steps) {
        each.sigma = std::max(each.sigma, usual);
    }
    return steps;
}

void note_window_bound(extrema_result& result, const level_log& log) {
    std::size_t bound = 0;
    for (const extremum& e : result.found) {
        bound += e.window_bound ? 1U : 0U;
    }
    if (bound == 0) {
        return;
    }
    result.doubts.add(
        {note_code::window_bound, severity::warning,
         fmt::format("{} nulls are narrower than {:.0f} windows of {:.3g} s: the window fills them",
                     bound, least_null_windows, log.window_s),
         fmt::format("their depth is a bound; give --window {:.3g}ms, or walk more slowly",
                     1000.0 * log.window_s / least_null_windows)});
}

} // namespace

extrema_result find_extrema(const level_log& log, quantity which, const extrema_rule& rule) {
    extrema_result result;
    const auto n = static_cast<double>(std::max<std::size_t>(2, log.records.size()));
    const double sigmas = normal_quantile(1.0 - 0.025 / n);
    const std::span<const level_record> all{log.records};
    for (std::size_t first = 0; first < all.size();) {
        std::size_t past = first;
        while (past < all.size() && all[past].stretch == all[first].stretch) {
            ++past;
        }
        const walk one{steps_of(all.subspan(first, past - first), which), sigmas, rule, log, which};
        const std::vector<extremum> found = one.extrema();
        result.found.insert(result.found.end(), found.begin(), found.end());
        first = past;
    }
    note_window_bound(result, log);
    return result;
}

sheet_table describe(const extrema_result& result) {
    sheet_table t;
    t.key = "extrema";
    t.rows = result.found.size();
    t.form = table_form::as_records;
    // Its own, so that the sheet outlives the result.
    const auto found = std::make_shared<const std::vector<extremum>>(result.found);
    const auto column = [&](const char* key, const char* unit, auto read) {
        t.columns.push_back(
            {key, unit, [found, read](std::size_t row) { return cell{read((*found)[row])}; }});
    };
    column("kind", "", [](const extremum& e) {
        return std::string{e.kind == extremum_kind::peak ? "peak" : "null"};
    });
    column("time_s", "s", [](const extremum& e) { return e.time_s; });
    column("time_s_u95", "s", [](const extremum& e) { return e.time_s_u95; });
    column("level_dbfs", "dBFS", [](const extremum& e) { return e.level_dbfs.value; });
    column("level_dbfs_low95", "dBFS", [](const extremum& e) { return e.level_dbfs.low95; });
    column("level_dbfs_high95", "dBFS", [](const extremum& e) { return e.level_dbfs.high95; });
    column("prominence_db", "dB", [](const extremum& e) { return e.prominence_db; });
    column("floor_limited", "", [](const extremum& e) { return e.floor_limited; });
    return t;
}

} // namespace tonewalk
