// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/meter/line_meter.hpp"

#include <algorithm>
#include <cmath>
#include <deque>
#include <utility>

#include <fmt/core.h>

#include "am_lines.hpp"
#include "frequency_curve.hpp"
#include "level_intervals.hpp"
#include "noise_history.hpp"
#include "noise_lines.hpp"
#include "stretch_samples.hpp"
#include "strip_picture.hpp"
#include "tone_place.hpp"
#include "tonewalk/base/error.hpp"
#include "tonewalk/base/quantity.hpp"

namespace tonewalk {
namespace {

constexpr double strong_ratio = 100.0; // 20 dB line SNR: knows its frequency, can be split
constexpr double most_offset_hz = 2.0; // of the curve from what a record was correlated at
constexpr double most_search_hz = 20.0;
constexpr double opening_unknown_hz = 0.25; // half a line of the 2 s that were searched
constexpr double least_tone_bins = 3.0;     // between carrier and tone lines
constexpr double least_noise = 1e-30;       // full scale^2; below any float sample's own rounding

/// A record whose frequency is not final yet: its lines' moments and its noise.
struct pending_record {
    std::size_t index = 0; // in the log
    std::uint32_t stretch = 0;
    double time_s = 0.0;
    double peak_hz = 0.0, carrier_power = 0.0; // of the highest line about the expected one
    am_lines lines;
    noise_reading noise;
};

/// A time to type that is no shorter than this one, in whole milliseconds.
std::string at_least(double seconds) {
    return format_option_seconds(std::ceil(seconds * 1e3) / 1e3);
}

} // namespace

struct line_meter::state {
    explicit state(const config& c)
        : set{c}, samples{static_cast<std::size_t>(c.grid.window_samples())},
          weights{hann_weights(samples)}, window_s{static_cast<double>(samples) / c.grid.rate_hz},
          reach_hz{std::min(most_offset_hz, 1.0 / window_s)},
          search_hz{std::min(most_search_hz, c.tone_hz.value_or(c.width_hz) / 3.0)},
          orders{orders_reaching(reach_hz, window_s, c.grid.rate_hz)}, plain{samples},
          weighted{samples}, noise{{c.grid.rate_hz, samples, c.width_hz, c.response}},
          noise_about{window_s}, curve{0.0, c.hold_frequency ? 0.0 : opening_unknown_hz},
          picture{c.width_hz, c.carrier_offset_hz}, place{window_s} {
        log.every_s = c.grid.every_s;
        log.window_s = window_s;
        log.width_hz = c.width_hz;
        log.start_utc = c.start_utc;
        log.tone_hz = c.tone_hz.value_or(not_measured);
        check_window();
    }
    void check_window() const;
    void measure_complete();
    void measure(sample_index first);
    void null_record(double time_s, std::uint32_t flags);
    [[nodiscard]] pending_record read(double time_s, double carrier_hz);
    [[nodiscard]] bool in_sight(const pending_record&) const noexcept;
    void search(pending_record&);
    void settle(bool stretch_over);
    void settle(const pending_record&);
    static void measure_tone(const three_lines&, double independent, level_record&, record_basis&);
    void complete();
    [[nodiscard]] double tone() const noexcept { return set.tone_hz.value_or(0.0); }

    config set;
    std::size_t samples;         // of a record
    std::vector<double> weights; // Hann, sum 1
    double window_s;
    double reach_hz;  // of a record's moments
    double search_hz; // for a carrier that was away
    moment_orders orders;
    sample_runs plain, weighted; // of the record at hand
    noise_lines noise;
    std::vector<fitted_line> fitted; // in the record at hand
    noise_history noise_about;
    frequency_curve curve;
    strip_picture picture;
    level_intervals intervals;
    level_log log;

    baseband_stretch stretch;
    stretch_samples history;
    sample_index next = 0; // record of the stretch

    std::deque<pending_record> pending;
    tone_place place;
    double offset_weight = 0.0, offset_sum = 0.0;
};

line_meter::line_meter(const config& c) : state_{std::make_unique<state>(c)} {}
line_meter::~line_meter() = default;

void line_meter::state::check_window() const {
    const std::string where = "--window " + format_option_seconds(set.grid.window_s);
    if (set.tone_hz && *set.tone_hz * window_s < least_tone_bins) {
        throw error{fault::malformed,
                    fmt::format("is too short to part the tone of {} from the carrier",
                                format_hz(*set.tone_hz, 5)),
                    where, fmt::format("give --window {} or longer", at_least(4.0 / *set.tone_hz))};
    }
    std::vector<fitted_line> lines{{0.0, {}}};
    if (set.tone_hz) {
        lines.push_back({*set.tone_hz, {}});
        lines.push_back({-*set.tone_hz, {}});
    }
    if (noise.usable(lines) == 0) {
        throw error{fault::malformed, "leaves no lines from which the noise could be told", where,
                    fmt::format("give --window {} or longer, or a larger --width",
                                at_least(40.0 / set.width_hz))};
    }
}

void line_meter::begin_stretch(const baseband_stretch& stretch) {
    state& s = *state_;
    s.stretch = stretch;
    s.history.begin();
    s.next = 0;
}

void line_meter::add(const baseband_block& block) {
    state_->history.add(block);
    state_->measure_complete();
}

/// Records whose samples, and the settling samples behind them, have all arrived.
void line_meter::state::measure_complete() {
    while (set.grid.holds(next, history.received())) {
        const sample_index first = set.grid.first(next);
        const double time_s = stretch.start_s + set.grid.centre_s(next);
        if (!stretch.held) {
            null_record(time_s, flag_not_held);
        } else if (history.touched(first, samples)) {
            null_record(time_s, flag_non_finite);
        } else {
            measure(first);
        }
        ++next;
        history.forget_before(set.grid.first(next));
    }
}

void line_meter::state::null_record(double time_s, std::uint32_t flags) {
    level_record record;
    record.time_s = time_s;
    record.stretch = stretch.index;
    record.flags = flags;
    log.records.push_back(record);
    intervals.add_null();
}

/// Lines and noise of the record at hand, for a carrier about `carrier_hz`.
pending_record line_meter::state::read(double time_s, double carrier_hz) {
    const am_lines lines{weighted, {set.grid.rate_hz, carrier_hz, set.tone_hz, orders}};
    const double peak_hz = lines.carrier_peak_hz(reach_hz);
    const three_lines found = lines.at(peak_hz, 0.0);
    fitted = {{peak_hz, found.carrier}};
    if (set.tone_hz) {
        fitted.push_back({peak_hz + tone(), found.upper});
        fitted.push_back({peak_hz - tone(), found.lower});
    }
    return {log.records.size(),
            stretch.index,
            time_s,
            peak_hz,
            std::norm(found.carrier),
            lines,
            noise.measure(plain, fitted)};
}

/// Whether the carrier's peak, not only its flank, was seen.
bool line_meter::state::in_sight(const pending_record& p) const noexcept {
    return std::abs(p.peak_hz - p.lines.carrier_hz()) < 0.999 * reach_hz;
}

/// Reads the record anew where a strong line near the expected place was not what was read, or
/// only its flank was.
void line_meter::state::search(pending_record& p) {
    constexpr int most_steps = 6;
    const double strong = strong_ratio * std::max(p.noise.mean_power, least_noise);
    const auto [hz, power] = noise.strongest_near(p.lines.carrier_hz(), search_hz);
    if (power >= std::max(strong, p.carrier_power)) {
        p = read(p.time_s, hz);
    } else if (p.carrier_power < strong) {
        return;
    }
    for (int k = 0; k < most_steps && !in_sight(p); ++k) {
        p = read(p.time_s, p.peak_hz);
    }
}

void line_meter::state::measure(sample_index first) {
    const std::span<const cf32> record = history.record(first, samples);
    plain.set(record);
    weighted.set(record, weights);
    const double time_s = stretch.start_s + set.grid.centre_s(next);
    pending_record p = read(time_s, curve.provisional_hz());
    const bool lost = !curve.is_fresh(time_s) || !in_sight(p); // it may have drifted meanwhile
    if (lost && !set.hold_frequency) {
        search(p);
    }
    picture.add(time_s, noise.line_powers(), noise.bin_hz(), fitted);
    const bool strong = !set.hold_frequency && in_sight(p) && p.noise.independent > 0.0 &&
                        p.carrier_power > strong_ratio * std::max(p.noise.mean_power, least_noise);
    curve.add({time_s, p.peak_hz, strong ? p.carrier_power : 0.0});
    level_record entry;
    entry.time_s = time_s;
    entry.stretch = stretch.index;
    log.records.push_back(entry);
    intervals.add_null();
    noise_about.add(time_s, stretch.index, p.noise);
    pending.push_back(std::move(p));
    curve.advance(time_s);
    settle(false);
}

/// Finishes the records whose frequency, and whose neighbours' noise where they need it, are known.
void line_meter::state::settle(bool stretch_over) {
    while (!pending.empty()) {
        const pending_record& p = pending.front();
        const double latest_s = pending.back().time_s;
        const bool curve_known = stretch_over || p.time_s < curve.known_until_s() ||
                                 latest_s - p.time_s > noise_history::reach_s;
        const bool noise_known =
            stretch_over || p.noise.independent >= noise_history::least_independent ||
            pending.back().stretch != p.stretch || latest_s - p.time_s > noise_history::reach_s;
        if (!curve_known || !noise_known) {
            return;
        }
        settle(p);
        pending.pop_front();
    }
}

void line_meter::state::settle(const pending_record& p) {
    const noise_reading floor = noise_about.at(p.time_s, p.stretch);
    const frequency_curve::value at = curve.at(p.time_s);
    three_lines lines = p.lines.at(at.hz, at.slope_hz_s);
    const auto gain = [this](double hz) { return set.response ? set.response(hz) : 1.0; };
    lines.carrier /= gain(at.hz);
    lines.upper /= gain(at.hz + tone());
    lines.lower /= gain(at.hz - tone());

    level_record& r = log.records[p.index];
    const double n = std::max(floor.mean_power, least_noise);
    const double carrier_power = std::norm(lines.carrier);
    r.noise_power = n;
    r.carrier_offset_hz = set.carrier_offset_hz + at.hz;
    r.carrier = {carrier_power - n, std::sqrt(n / 2.0),
                 carrier_power > n * carrier_detection_ratio(floor.independent)};
    offset_weight += std::max(0.0, r.carrier.power);
    offset_sum += std::max(0.0, r.carrier.power) * at.hz;

    record_basis basis{.independent = floor.independent, .unknown_hz = at.unknown_hz};
    if (set.tone_hz) {
        basis.split = r.carrier.power > strong_ratio * n;
        measure_tone(lines, floor.independent, r, basis);
        place.add(lines, p.lines.tone_bend(at.hz), n);
    }
    intervals.set(p.index, basis);
}

void line_meter::state::measure_tone(const three_lines& lines, double independent, level_record& r,
                                     record_basis& basis) {
    const double n = r.noise_power;
    const double sum = std::norm(lines.upper) + std::norm(lines.lower);
    r.tone.sigma = std::sqrt(n);
    r.tone.detected = sum > 2.0 * n * tone_detection_ratio(independent);
    if (basis.split) {
        const split_power split = split_tone(lines, n);
        r.tone.power = split.in_phase;
        basis.across_power = split.across;
    } else {
        r.tone.power = 2.0 * (sum - 2.0 * n);
    }
}

void line_meter::end_stretch() {} // its last records may wait for the curve

void line_meter::finish() {
    state_->complete();
}

void line_meter::state::complete() {
    if (!pending.empty()) {
        curve.advance(pending.back().time_s + 20.0);
        settle(true);
    }
    log.carrier_offset_hz =
        set.carrier_offset_hz + (offset_weight > 0.0 ? offset_sum / offset_weight : 0.0);
    const double shift_hz = set.hold_frequency ? 0.0 : place.shift_hz();
    if (set.tone_hz) {
        log.tone_hz = *set.tone_hz + shift_hz;
    }
    intervals.complete(
        log, {.tone_response = hann_response(shift_hz * window_s),
              .carrier_offset_hz = log.carrier_offset_hz,
              .dc_amplitude = set.dc_amplitude,
              .image_ratio = set.image_ratio,
              .envelope_noise_bandwidth_hz = set.envelope_in_use ? set.noise_bandwidth_hz : 0.0,
              .background = set.background});
    log.strip = picture.result();
}

bool line_meter::has_records() const noexcept {
    return !state_->log.records.empty();
}

level_log line_meter::take_result() {
    state& s = *state_;
    if (s.log.records.empty()) {
        throw error{fault::malformed, "is longer than every gapless stretch of the recording",
                    "--window " + format_option_seconds(s.set.grid.window_s),
                    "give a shorter --window"};
    }
    return std::move(s.log);
}

} // namespace tonewalk
