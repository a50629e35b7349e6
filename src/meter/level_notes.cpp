// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/meter/level_notes.hpp"

#include <algorithm>
#include <cmath>

#include <fmt/core.h>

#include "tonewalk/maths/distribution.hpp"
#include "tonewalk/maths/quantile.hpp"
#include "tonewalk/maths/window.hpp"

namespace tonewalk {
namespace {

constexpr double weak_share = 0.01; // of records that are not detected
constexpr double least_step_db = 0.4;
constexpr double least_agc_db = 0.5;
constexpr double doubt_sigmas =
    4.0; // a whole log is searched for steps: 1.96 would find them anywhere
constexpr double step_side_s = 10.0;
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
        log.doubts.add({note_code::depth_varies, severity::warning,
                        fmt::format("tone and carrier do not fade alike: the depth "
                                    "scatters {:.1f} times as much "
                                    "as noise explains",
                                    std::sqrt(chi_square / (n - 1.0))),
                        "look for a second signal, selective fading or a changing "
                        "transmitter; the tone's "
                        "level "
                        "then says more of the audio than of the field"});
    }
}

/// Carrier and noise of the records that told both, in decibels.
struct level_pair {
    double time_s = 0.0, carrier_db = 0.0, carrier_sigma_db = 0.0, noise_db = 0.0;
    std::uint32_t stretch = 0;
};

std::vector<level_pair> pairs_of(const level_log& log) {
    std::vector<level_pair> pairs;
    for (const level_record& r : log.records) {
        if (!std::isnan(r.carrier_dbfs.value) && r.noise_power > 0.0) {
            const double relative = r.carrier.sigma / std::sqrt(r.carrier.power);
            pairs.push_back({r.time_s, r.carrier_dbfs.value, 20.0 / std::log(10.0) * relative,
                             10.0 * std::log10(r.noise_power), r.stretch});
        }
    }
    return pairs;
}

struct mean_and_error {
    double mean = 0.0, error = 0.0;
};

/// Mean of the noise over [first, past) and its standard error from the
/// scatter, neighbours overlapping.
mean_and_error noise_mean(const std::vector<level_pair>& pairs, std::size_t first, std::size_t past,
                          double spread) {
    const auto n = static_cast<double>(past - first);
    double sum = 0.0, squares = 0.0;
    for (std::size_t k = first; k < past; ++k) {
        sum += pairs[k].noise_db;
        squares += pairs[k].noise_db * pairs[k].noise_db;
    }
    const double variance = std::max(0.0, squares / n - sum / n * (sum / n));
    return {sum / n, std::sqrt(variance / n * spread * n / std::max(1.0, n - 1.0))};
}

/// Between the records `before` and `after`: what the carrier steps by, and the
/// noise, 10 s either side.
struct step_pair {
    mean_and_error carrier, noise;
    [[nodiscard]] bool are_alike() const {
        constexpr double least_difference_db = 0.15;
        const double doubt = doubt_sigmas * std::hypot(carrier.error, noise.error);
        return std::abs(carrier.mean - noise.mean) < std::max(least_difference_db, doubt) &&
               std::abs(noise.mean) > doubt_sigmas * noise.error;
    }
    /// The one step that both show, weighted by what each knows.
    [[nodiscard]] double both() const {
        const double c = carrier.error * carrier.error, n = noise.error * noise.error;
        return (carrier.mean * n + noise.mean * c) / (c + n);
    }
};

step_pair step_between(const std::vector<level_pair>& pairs, std::size_t before, std::size_t after,
                       std::size_t side, double spread) {
    const std::size_t first = before + 1 > side ? before + 1 - side : 0;
    const mean_and_error left = noise_mean(pairs, first, before + 1, spread);
    const mean_and_error right =
        noise_mean(pairs, after, std::min(pairs.size(), after + side), spread);
    return {{pairs[after].carrier_db - pairs[before].carrier_db,
             std::hypot(pairs[after].carrier_sigma_db, pairs[before].carrier_sigma_db)},
            {right.mean - left.mean, std::hypot(left.error, right.error)}};
}

/// A step of the receiver's gain moves carrier and noise together by the same
/// amount within one window.
void note_gain_step(level_log& log, const std::vector<level_pair>& pairs) {
    const auto side = static_cast<std::size_t>(std::max(4.0, step_side_s / log.every_s));
    const auto across = static_cast<std::size_t>(std::ceil(log.window_s / log.every_s)) + 1;
    constexpr std::size_t least_side = 20;
    const double spread = overlap_spread(log);
    double best_db = 0.0, best_s = 0.0;
    for (std::size_t k = least_side; k + across + least_side < pairs.size(); ++k) {
        const level_pair &before = pairs[k], &after = pairs[k + across];
        const double carrier_step_db = std::abs(after.carrier_db - before.carrier_db);
        if (before.stretch != after.stretch || carrier_step_db < least_step_db / 2.0) {
            continue;
        }
        const step_pair step = step_between(pairs, k, k + across, side, spread);
        const double step_db = step.both();
        if (std::abs(step_db) >= least_step_db && step.are_alike() &&
            std::abs(step_db) > std::abs(best_db)) {
            best_db = step_db;
            best_s = 0.5 * (before.time_s + after.time_s);
        }
    }
    if (best_db != 0.0) {
        log.doubts.add({note_code::gain_step, severity::warning,
                        fmt::format("carrier and noise step together by {:+.2f} dB at {:.1f} s",
                                    best_db, best_s),
                        "the receiver's gain changed; levels before and after do not "
                        "compare"});
    }
}

/// Gain control turns the noise up when the carrier fades: noise falls as the
/// carrier rises.
void note_gain_control(level_log& log, const std::vector<level_pair>& pairs) {
    constexpr std::size_t least_records = 30;
    if (pairs.size() < least_records || log.doubts.has(note_code::gain_step)) {
        return;
    }
    const auto n = static_cast<double>(pairs.size());
    double mean_c = 0.0, mean_n = 0.0;
    std::vector<double> carriers;
    for (const level_pair& p : pairs) {
        mean_c += p.carrier_db / n;
        mean_n += p.noise_db / n;
        carriers.push_back(p.carrier_db);
    }
    double cc = 0.0, cn = 0.0, nn = 0.0;
    for (const level_pair& p : pairs) {
        cc += (p.carrier_db - mean_c) * (p.carrier_db - mean_c);
        cn += (p.carrier_db - mean_c) * (p.noise_db - mean_n);
        nn += (p.noise_db - mean_n) * (p.noise_db - mean_n);
    }
    if (cc <= 0.0) {
        return;
    }
    const double slope = cn / cc;
    const double error =
        std::sqrt(std::max(0.0, nn - slope * cn) / (n - 2.0) / cc * overlap_spread(log));
    std::sort(carriers.begin(), carriers.end());
    const double range = quantile_sorted(carriers, 0.98) - quantile_sorted(carriers, 0.02);
    const double moved = -slope * range;
    if (moved >= least_agc_db && -slope > doubt_sigmas * error) {
        log.doubts.add(
            {note_code::agc_suspected, severity::warning,
             fmt::format("the noise rises by {:.1f} dB as the carrier falls by {:.1f} dB", moved,
                         range),
             "switch the receiver's gain control off and record again; fades are "
             "deeper than "
             "shown"});
    }
}

} // namespace

void add_level_notes(level_log& log, quantity used) {
    if (log.records.empty()) {
        return;
    }
    note_weak(log, flag_weak_carrier, note_code::weak_carrier, "carrier",
              "bounds are given where it does not; a longer --window reaches lower");
    if (log.has_tone()) {
        note_weak(log, flag_weak_tone, note_code::weak_tone, "tone",
                  "bounds are given where it does not; a longer --window reaches "
                  "lower, or use "
                  "--quantity carrier");
    }
    const std::size_t limited =
        flagged(log, used == quantity::carrier ? flag_weak_carrier : flag_weak_tone);
    if (limited > 0) {
        log.doubts.add({note_code::floor_limited, severity::info,
                        fmt::format("{} of {} levels are bounds set by the noise", limited,
                                    log.records.size()),
                        "the true level there may be lower than shown"});
    }
    const std::size_t skipped = flagged(log, flag_not_held);
    if (skipped > 0) {
        log.doubts.add(
            {note_code::segments_skipped, severity::warning,
             fmt::format("{} records lie in segments whose band does not hold the channel",
                         skipped),
             "they are null; give --carrier without a sign to follow it through "
             "other segments"});
    }
    const std::size_t suppressed = flagged(log, flag_envelope_suppressed);
    if (suppressed > 0) {
        log.doubts.add({note_code::envelope_suppressed, severity::warning,
                        fmt::format("in {} of {} records noise makes an envelope "
                                    "read the tone 0.1 dB or more low",
                                    suppressed, log.records.size()),
                        "nulls look deeper than they are; use tone_dbfs, or "
                        "--detector synchronous"});
    }
    if (log.has_tone()) {
        note_depth_varies(log);
    }
    const std::vector<level_pair> pairs = pairs_of(log);
    note_gain_step(log, pairs);
    note_gain_control(log, pairs);
}

} // namespace tonewalk
