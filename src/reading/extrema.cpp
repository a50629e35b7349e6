// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/reading/extrema.hpp"

#include <algorithm>
#include <cmath>
#include <memory>
#include <span>

#include <fmt/core.h>

#include "extremum_placer.hpp"
#include "tonewalk/maths/distribution.hpp"
#include "tonewalk/maths/quantile.hpp"

namespace tonewalk {
namespace {

struct turn {
    std::size_t place = 0;
    extremum_kind kind = extremum_kind::peak;
};

class walk {
public:
    walk(std::vector<log_step> steps, double sigmas, double least_ratio, const level_log& log,
         quantity which)
        : steps_{std::move(steps)}, sigmas_{sigmas},
          least_ratio_{least_ratio}, log_{log}, which_{which} {}
    [[nodiscard]] std::vector<extremum> extrema() const;

private:
    [[nodiscard]] bool differ(std::size_t higher, std::size_t lower) const noexcept;
    [[nodiscard]] std::vector<turn> turns() const;
    void set_prominence(std::vector<extremum>&, const std::vector<turn>&) const;
    [[nodiscard]] double shown_db(std::size_t place) const noexcept;

    std::vector<log_step> steps_;
    double sigmas_, least_ratio_;
    const level_log& log_;
    quantity which_;
};

bool walk::differ(std::size_t higher, std::size_t lower) const noexcept {
    const log_step &h = steps_[higher], &l = steps_[lower];
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
    const extremum_placer placer{steps_, log_, which_};
    all.reserve(at.size());
    for (std::size_t k = 0; k < at.size(); ++k) {
        const extremum_placer::reach between{
            k > 0 ? at[k - 1].place : 0, k + 1 < at.size() ? at[k + 1].place : steps_.size() - 1};
        all.push_back(at[k].kind == extremum_kind::peak ? placer.peak_at(at[k].place, between)
                                                        : placer.null_at(at[k].place, between));
    }
    set_prominence(all, at);
    return all;
}

std::vector<log_step> steps_of(std::span<const level_record> records, quantity which) {
    std::vector<log_step> steps;
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
    for (const log_step& each : steps) {
        sigmas.push_back(each.sigma);
    }
    const double usual = median(std::move(sigmas));
    for (log_step& each : steps) {
        each.sigma = std::max(each.sigma, usual);
    }
    return steps;
}

constexpr double least_tone_cycles = 4.0; // that a window holds

/// What to type: two digits, rounded down.
double window_to_type_ms(double longest_s) {
    if (longest_s <= 0.0) {
        return 0.0;
    }
    const double step_ms = std::pow(10.0, std::floor(std::log10(1000.0 * longest_s)) - 1.0);
    return std::floor(1000.0 * longest_s / step_ms) * step_ms;
}

void note_window_bound(extrema_result& result, const level_log& log) {
    std::size_t bound = 0;
    double narrowest_s = least_null_windows * log.window_s;
    for (const extremum& e : result.found) {
        bound += e.window_bound ? 1U : 0U;
        narrowest_s = e.window_bound ? std::min(narrowest_s, e.width_s) : narrowest_s;
    }
    if (bound == 0) {
        return;
    }
    const bool one = bound == 1;
    const double window_ms = window_to_type_ms(narrowest_s / least_null_windows);
    const double least_s = log.has_tone() ? least_tone_cycles / log.tone_hz : 0.0;
    const std::string mend =
        window_ms > 1000.0 * least_s
            ? fmt::format("give --window {:g}ms, or walk more slowly", window_ms)
            : "walk more slowly";
    result.doubts.add(
        {note_code::window_bound, severity::warning,
         fmt::format("{} narrower than {:.0f} windows of {:.3g} s: the window fills {}",
                     one ? "1 null is" : fmt::format("{} nulls are", bound), least_null_windows,
                     log.window_s, one ? "it" : "them"),
         fmt::format("{} depth is a bound; {}", one ? "its" : "their", mend)});
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
        const walk one{steps_of(all.subspan(first, past - first), which), sigmas, rule.least_ratio,
                       log, which};
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
