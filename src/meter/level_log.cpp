// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/meter/level_log.hpp"

#include <algorithm>
#include <cmath>
#include <utility>

#include "tonewalk/base/decibel.hpp"
#include "tonewalk/maths/quantile.hpp"

namespace tonewalk {
namespace {

constexpr std::size_t most_curve_points = 2000;

struct flag_name {
    record_flag flag;
    note_code code;
};
constexpr flag_name flag_names[] = {
    {flag_non_finite, note_code::non_finite_samples},
    {flag_not_held, note_code::segments_skipped},
    {flag_weak_carrier, note_code::weak_carrier},
    {flag_weak_tone, note_code::weak_tone},
    {flag_envelope_suppressed, note_code::envelope_suppressed},
    {flag_background_limited, note_code::background_limited},
};

/// Detected levels ascending, behind the undetected ones, which count as lowest.
struct ordered_levels {
    std::vector<double> levels;  // minus infinity where not detected
    double bound = not_measured; // the largest high95 of those
};

ordered_levels in_order(const level_log& log, quantity which) {
    ordered_levels o;
    for (const level_record& r : log.records) {
        const interval_estimate& level = level_of(r, which);
        if (!std::isnan(level.value)) {
            o.levels.push_back(level.value);
        } else if (!std::isnan(level.high95)) {
            o.levels.push_back(-std::numeric_limits<double>::infinity());
            o.bound = std::fmax(o.bound, level.high95);
        }
    }
    std::sort(o.levels.begin(), o.levels.end());
    return o;
}

sheet_column number_column(std::string key, std::string unit,
                           std::function<double(std::size_t)> at) {
    return {std::move(key), std::move(unit),
            [at = std::move(at)](std::size_t row) { return cell{at(row)}; }};
}

void add_level_columns(sheet_table& t, const level_log& log, const std::string& key,
                       const std::string& unit, interval_estimate level_record::*field) {
    const auto part = [&log, field](double interval_estimate::*which) {
        return [&log, field, which](std::size_t row) { return log.records[row].*field.*which; };
    };
    t.columns.push_back(number_column(key, unit, part(&interval_estimate::value)));
    t.columns.push_back(number_column(key + "_low95", unit, part(&interval_estimate::low95)));
    t.columns.push_back(number_column(key + "_high95", unit, part(&interval_estimate::high95)));
    t.columns.push_back(number_column(key + "_u95", unit, part(&interval_estimate::u95)));
}

sheet_table log_table(const level_log& log) {
    sheet_table t;
    t.key = "log";
    t.rows = log.records.size();
    const auto field = [&log](double level_record::*which) {
        return [&log, which](std::size_t row) { return log.records[row].*which; };
    };
    t.columns.push_back(number_column("time_s", "s", field(&level_record::time_s)));
    t.columns.push_back(
        {"utc", "", [&log](std::size_t row) {
             return log.start_utc
                        ? cell{format_utc(moved_by(*log.start_utc, log.records[row].time_s), 6)}
                        : cell{};
         }});
    add_level_columns(t, log, "carrier_dbfs", "dBFS", &level_record::carrier_dbfs);
    add_level_columns(t, log, "tone_dbfs", "dBFS", &level_record::tone_dbfs);
    add_level_columns(t, log, "depth_percent", "%", &level_record::depth_percent);
    t.columns.push_back(number_column("tone_snr_db", "dB", field(&level_record::tone_snr_db)));
    t.columns.push_back(number_column("noise_dbfs_hz", "dBFS/Hz", [&log](std::size_t row) {
        return 10.0 * std::log10(log.records[row].noise_power / log.noise_bandwidth_hz());
    }));
    t.columns.push_back(
        number_column("carrier_offset_hz", "Hz", field(&level_record::carrier_offset_hz)));
    if (!log.detector_tone_dbfs.empty()) {
        t.columns.push_back(number_column(log.detector_column, "dBFS", [&log](std::size_t row) {
            return log.detector_tone_dbfs[row];
        }));
    }
    t.columns.push_back({"flags", "", [&log](std::size_t row) {
                             return cell{flag_words(log.records[row].flags)};
                         }});
    return t;
}

/// Over the records that tell the value.
template <class Value>
double median_over(const level_log& log, Value value) {
    std::vector<double> values;
    for (const level_record& r : log.records) {
        if (const double x = value(r); !std::isnan(x)) {
            values.push_back(x);
        }
    }
    return median(std::move(values));
}

void add_medians(sheet& s, const level_log& log) {
    s.add("carrier_median_dbfs", "dBFS",
          median_over(log, [](const level_record& r) { return r.carrier_dbfs.value; }));
    s.add("tone_median_dbfs", "dBFS",
          median_over(log, [](const level_record& r) { return r.tone_dbfs.value; }));
    s.add("depth_median_percent", "%",
          median_over(log, [](const level_record& r) { return r.depth_percent.value; }));
    const double noise = median_over(log, [](const level_record& r) { return r.noise_power; });
    s.add("noise_median_dbfs_hz", "dBFS/Hz", 10.0 * std::log10(noise / log.noise_bandwidth_hz()));
}

/// Of each run of records the lowest and the highest, so that thinning hides no null.
curve thinned(const level_log& log, quantity which) {
    curve c;
    c.name = which == quantity::carrier ? "log" : "log_tone";
    c.kind = "line";
    c.x_unit = "s";
    c.y_unit = "dBFS";
    constexpr std::size_t points_a_run = 2;
    const std::size_t run =
        1 + points_a_run * log.records.size() / (most_curve_points + points_a_run);
    const auto shown = [&](std::size_t k) {
        const interval_estimate& level = level_of(log.records[k], which);
        return std::isnan(level.value) ? level.high95 : level.value;
    };
    const auto point = [&](std::size_t k) {
        c.x.push_back(log.records[k].time_s);
        c.y.push_back(shown(k));
    };
    for (std::size_t first = 0; first < log.records.size(); first += run) {
        const std::size_t past = std::min(first + run, log.records.size());
        std::size_t low = first, high = first;
        for (std::size_t k = first + 1; k < past; ++k) {
            low = !(shown(low) <= shown(k)) ? k : low; // a null record gives way to any
            high = !(shown(high) >= shown(k)) ? k : high;
        }
        point(std::min(low, high));
        if (low != high) {
            point(std::max(low, high));
        }
    }
    return c;
}

} // namespace

std::string flag_words(std::uint32_t flags) {
    std::string words;
    for (const flag_name& each : flag_names) {
        if ((flags & each.flag) != 0) {
            words += (words.empty() ? "" : " ") + std::string{name(each.code)};
        }
    }
    return words;
}

const line_power& line_of(const level_record& r, quantity which) noexcept {
    return which == quantity::carrier ? r.carrier : r.tone;
}

const interval_estimate& level_of(const level_record& r, quantity which) noexcept {
    return which == quantity::carrier ? r.carrier_dbfs : r.tone_dbfs;
}

interval_estimate with_common_doubts(const interval_estimate& level, const level_log& log,
                                     quantity which) noexcept {
    const double bound = which == quantity::carrier ? log.carrier_bound : log.tone_bound;
    if (bound == 0.0 && log.common_u95_db == 0.0) {
        return level;
    }
    const auto moved = [bound](double db, double sign) {
        const double amplitude = decibel::from_db(db).amplitude_ratio() + sign * bound;
        return amplitude > 0.0 ? decibel::from_amplitude_ratio(amplitude).db() : not_measured;
    };
    interval_estimate r = level;
    if (std::isnan(level.value)) {
        r.high95 = moved(level.high95, 1.0) + log.common_u95_db;
        return r;
    }
    r.low95 = level.value - std::hypot(level.value - moved(level.low95, -1.0), log.common_u95_db);
    r.high95 = level.value + std::hypot(moved(level.high95, 1.0) - level.value, log.common_u95_db);
    r.u95 = std::isnan(level.u95) ? not_measured : 0.5 * (r.high95 - r.low95);
    return r;
}

level_summary summarise(const level_log& log, quantity which) {
    const ordered_levels o = in_order(log, which);
    level_summary s;
    s.records = log.records.size();
    s.undetected = static_cast<std::size_t>(
        std::count_if(o.levels.begin(), o.levels.end(), [](double x) { return std::isinf(x); }));
    const auto take = [&o](double q, double& value, double& bound) {
        const double level = quantile_sorted(o.levels, q);
        value = std::isfinite(level) ? level : not_measured;
        bound = std::isfinite(level) ? not_measured : o.bound;
    };
    take(1.0, s.max_dbfs, s.max_high95);
    take(0.5, s.median_dbfs, s.median_high95);
    take(0.0, s.min_dbfs, s.min_high95);
    take(0.1, s.p10_dbfs, s.p10_high95);
    take(0.9, s.p90_dbfs, s.p90_high95);
    s.swing_db = s.max_dbfs - s.min_dbfs;
    s.swing_at_least =
        std::isnan(s.min_dbfs) ? std::fmax(0.0, s.max_dbfs - s.min_high95) : not_measured;
    return s;
}

sheet describe(const level_summary& s) {
    sheet out;
    const auto level = [&out](const char* key, double value, double bound) {
        out.add(key, "dBFS", value);
        if (!std::isnan(bound)) {
            out.add(std::string{key} + "_high95", "dBFS", bound);
        }
    };
    level("max_dbfs", s.max_dbfs, s.max_high95);
    level("median_dbfs", s.median_dbfs, s.median_high95);
    level("min_dbfs", s.min_dbfs, s.min_high95);
    level("p10_dbfs", s.p10_dbfs, s.p10_high95);
    level("p90_dbfs", s.p90_dbfs, s.p90_high95);
    out.add("swing_db", "dB", s.swing_db);
    out.add("swing_at_least", "dB", s.swing_at_least);
    return out;
}

sheet describe(const level_log& log) {
    sheet s;
    s.add("interval_s", "s", log.every_s);
    s.add("window_s", "s", log.window_s);
    s.add("noise_bandwidth_hz", "Hz", log.noise_bandwidth_hz());
    add_medians(s, log);
    s.add(log_table(log));
    s.add(thinned(log, quantity::carrier));
    if (log.has_tone()) {
        s.add(thinned(log, quantity::tone));
    }
    s.add(log.strip);
    return s;
}

} // namespace tonewalk
