// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/meter/gain_control.hpp"

#include <algorithm>
#include <cmath>

#include <fmt/core.h>

#include "gain_steps.hpp"
#include "noise_rise.hpp"
#include "tonewalk/maths/window.hpp"

namespace tonewalk {
namespace {

constexpr double least_control_db = 0.5;
constexpr std::size_t least_records = 30;
constexpr double least_range_db = 6.0; // of the carrier
constexpr double least_swing_db = 3.0; // of the noise alone

note control_note(const gain_control_result& r) {
    return {note_code::agc_suspected, severity::warning, r.evidence,
            "switch the receiver's gain control off and record again; fades are deeper than "
            "shown"};
}

note step_note(const gain_control_result& r) {
    return {note_code::gain_step, severity::warning,
            fmt::format("carrier and noise step together by {:+.2f} dB at {:.1f} s", r.step_db,
                        r.step_s),
            "the receiver's gain changed; levels before and after do not compare"};
}

/// How far the noise moves by itself: between the second in which it is highest and the one in
/// which it is lowest; 0 where that is no more than its scatter.
double noise_swing_db(const std::vector<level_pair>& pairs, double every_s, double inflation) {
    constexpr double run_s = 1.0, swing_sigmas = 6.0;
    constexpr std::size_t least_run = 8;
    const auto run = std::max(least_run, static_cast<std::size_t>(run_s / every_s));
    const noise_means means{pairs, inflation};
    noise_means::run high{0, run}, low{0, run};
    for (std::size_t first = run; first + run <= pairs.size(); first += run) {
        const noise_means::run here{first, first + run};
        high = means.difference(here, high).value > 0.0 ? here : high;
        low = means.difference(here, low).value < 0.0 ? here : low;
    }
    const value_and_error swing = means.difference(high, low);
    return swing.exceeds(swing_sigmas) ? swing.value : 0.0;
}

void judge(gain_control_result& r, const noise_rise& rise, double swing_db) {
    r.carrier_range_db = rise.range_db;
    if (swing_db >= least_swing_db && swing_db > 2.0 * rise.range_db) {
        r.judged = r.suspected = true;
        r.noise_rise_db = swing_db;
        r.evidence =
            fmt::format("the noise moves by {:.1f} dB while the carrier moves by {:.1f} dB "
                        "only, as if the receiver held the carrier's level",
                        swing_db, rise.range_db);
        return;
    }
    if (rise.range_db < least_range_db) {
        r.evidence = fmt::format("the carrier moves by {:.1f} dB only: gain control would not show",
                                 rise.range_db);
        return;
    }
    if (rise.sigmas <= noise_rise_sigmas && rise.visible_db > least_control_db) {
        r.evidence = fmt::format("the noise scatters too much to show gain control below {:.1f} dB",
                                 rise.visible_db);
        return;
    }
    r.judged = true;
    r.noise_rise_db = rise.db;
    r.suspected = rise.sigmas > noise_rise_sigmas && rise.db >= least_control_db;
    r.evidence = r.suspected
                     ? fmt::format("the noise rises by {:.1f} dB as the carrier falls by {:.1f} dB",
                                   rise.db, rise.range_db)
                     : fmt::format("the noise stays within {:.1f} dB as the carrier falls by "
                                   "{:.1f} dB",
                                   std::max(0.1, std::abs(rise.db)), rise.range_db);
}

} // namespace

gain_control_result judge_gain_control(const level_log& log, bool compressed) {
    gain_control_result r;
    const std::vector<level_pair> pairs = pairs_of(log);
    if (pairs.size() < least_records) {
        r.evidence = "too few records show carrier and noise";
        return r;
    }
    const double inflation = hann_overlap_inflation(log.every_s / log.window_s).power;
    const gain_step step = find_gain_step(pairs, log, inflation);
    const noise_rise rise = find_noise_rise(pairs, inflation);
    judge(r, rise, noise_swing_db(pairs, log.every_s, inflation));
    // One gain that moves can look like both: it is what explains more of the noise.
    if (step.sigmas > 0.0 && (!r.suspected || step.sigmas > rise.sigmas)) {
        r.step_db = step.db;
        r.step_s = step.time_s;
        r.suspected = false;
        const note found = step_note(r);
        r.evidence = found.text;
        r.doubts.add(found);
    } else if (r.suspected && compressed) {
        r.judged = r.suspected = false;
        r.evidence = "the receiver squeezes strong signals, which takes the noise down with them "
                     "as gain control would";
    } else if (r.suspected) {
        r.doubts.add(control_note(r));
    }
    return r;
}

sheet describe(const gain_control_result& r) {
    sheet s;
    s.add("suspected", "", r.judged ? cell{r.suspected} : cell{});
    s.add("evidence", "", r.evidence);
    return s;
}

} // namespace tonewalk
