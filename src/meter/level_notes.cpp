// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/meter/level_notes.hpp"

#include <algorithm>
#include <cmath>

#include <fmt/core.h>

#include "tonewalk/maths/distribution.hpp"
#include "tonewalk/maths/window.hpp"
#include "tonewalk/meter/gain_control.hpp"

namespace tonewalk {
namespace {

constexpr double weak_share = 0.01;          // of records that are not detected
constexpr double least_depth_scatter = 1e-4; // relative; numbers and filters are not better

template <class Test>
std::size_t count_records(const level_log& log, Test test) {
    return static_cast<std::size_t>(std::count_if(log.records.begin(), log.records.end(), test));
}

std::size_t flagged(const level_log& log, record_flag flag) {
    return count_records(log, [flag](const level_record& r) { return (r.flags & flag) != 0; });
}

double share_of(std::size_t part, const level_log& log) {
    return static_cast<double>(part) / static_cast<double>(log.records.size());
}

void note_weak(level_log& log, record_flag flag, note_code code, const char* what,
               const char* advice) {
    const std::size_t weak = flagged(log, flag);
    if (share_of(weak, log) > weak_share) {
        log.doubts.add({code, severity::warning,
                        fmt::format("the {} stands out of the noise in {} of {} records only", what,
                                    log.records.size() - weak, log.records.size()),
                        advice});
    }
}

/// Records that overlap scatter together: this many of them tell what one would.
double overlap_spread(const level_log& log) {
    return hann_overlap_inflation(log.every_s / log.window_s).power;
}

void note_depth_varies(level_log& log) {
    double weight = 0.0, sum = 0.0, squares = 0.0, n = 0.0;
    for (const level_record& r : log.records) {
        if (std::isnan(r.depth_percent.u95)) {
            continue;
        }
        const double tone = r.tone.sigma / std::sqrt(r.tone.power);
        const double carrier = r.carrier.sigma / std::sqrt(r.carrier.power);
        const double variance =
            tone * tone + carrier * carrier + least_depth_scatter * least_depth_scatter;
        const double value = std::log(r.depth_percent.value);
        weight += 1.0 / variance;
        sum += value / variance;
        squares += value * value / variance;
        n += 1.0;
    }
    if (n < 3.0) {
        return;
    }
    const double chi_square = squares - sum * sum / weight;
    const double spread = overlap_spread(log);
    const double degrees = (n - 1.0) / spread;
    if (chi_square / spread > chi_square_quantile(0.999, degrees)) {
        log.doubts.add(
            {note_code::depth_varies, severity::warning,
             fmt::format("tone and carrier do not fade alike: the depth scatters {:.1f} times as "
                         "much as noise explains",
                         std::sqrt(chi_square / (n - 1.0))),
             "look for a second signal, selective fading or a changing transmitter; the tone's "
             "level then says more of the audio than of the field"});
    }
}

void note_limited(level_log& log, record_flag weak) {
    const std::size_t limited = flagged(log, weak);
    if (limited > 0) {
        log.doubts.add({note_code::floor_limited, severity::info,
                        fmt::format("{} of {} levels are bounds set by the noise", limited,
                                    log.records.size()),
                        "the true level there may be lower than shown"});
    }
}

void note_skipped(level_log& log) {
    const std::size_t skipped = flagged(log, flag_not_held);
    if (skipped > 0) {
        log.doubts.add(
            {note_code::segments_skipped, severity::warning,
             fmt::format("{} records lie in segments whose band does not hold the channel",
                         skipped),
             "they are null; give --carrier without a sign to follow it through other segments"});
    }
}

void note_suppressed(level_log& log, const char* advice) {
    const std::size_t suppressed = flagged(log, flag_envelope_suppressed);
    if (suppressed > 0) {
        log.doubts.add(
            {note_code::envelope_suppressed, severity::warning,
             fmt::format("in {} of {} records noise makes an envelope read the tone 0.1 dB or "
                         "more low",
                         suppressed, log.records.size()),
             advice});
    }
}

} // namespace

void add_level_notes(level_log& log, quantity used, const level_note_options& o) {
    if (log.records.empty()) {
        return;
    }
    note_weak(log, flag_weak_carrier, note_code::weak_carrier, "carrier",
              o.heard ? "the audio there is mostly noise"
                      : "bounds are given where it does not; a longer --window reaches lower");
    if (log.has_tone()) {
        note_weak(log, flag_weak_tone, note_code::weak_tone, "tone",
                  o.heard ? "the audio there is mostly noise; a smaller --width lets less of it in"
                          : "bounds are given where it does not; a longer --window reaches lower, "
                            "or use --quantity carrier");
    }
    if (!o.heard) {
        note_limited(log, used == quantity::carrier ? flag_weak_carrier : flag_weak_tone);
    }
    note_skipped(log);
    note_suppressed(log, o.heard ? "the audio's nulls sound deeper than they are; use --detector "
                                   "synchronous"
                                 : "nulls look deeper than they are; use tone_dbfs, or --detector "
                                   "synchronous");
    if (log.has_tone()) {
        note_depth_varies(log);
    }
    log.doubts.merge(judge_gain_control(log, o.compressed).doubts);
}

} // namespace tonewalk
