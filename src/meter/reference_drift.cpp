// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/meter/reference_drift.hpp"

#include <algorithm>
#include <cmath>

#include <fmt/core.h>

#include "tonewalk/base/decibel.hpp"
#include "tonewalk/base/error.hpp"
#include "tonewalk/maths/distribution.hpp"
#include "tonewalk/maths/window.hpp"

namespace tonewalk {
namespace {

const double db_per_relative_power = 10.0 / std::log(10.0);

estimate level_at(const level_log& log, const reference_span& span) {
    double n = 0.0, sum = 0.0, squares = 0.0, noise = 0.0;
    for (const level_record& r : log.records) {
        const bool whole = r.time_s - 0.5 * log.window_s >= span.from_s &&
                           r.time_s + 0.5 * log.window_s <= span.until_s;
        if (whole && r.carrier.detected) {
            n += 1.0;
            sum += r.carrier.power;
            squares += r.carrier.power * r.carrier.power;
            noise += 4.0 * r.carrier.power * r.carrier.sigma * r.carrier.sigma;
        }
    }
    if (n < 2.0 || sum <= 0.0) {
        throw error{fault::malformed, "holds fewer than two records that show the carrier",
                    fmt::format("--reference {:g}s:{:g}s", span.from_s, span.until_s),
                    fmt::format("give some seconds, and at least {:.3g}s, of steady signal",
                                log.window_s + log.every_s)};
    }
    const double mean = sum / n;
    // No less than what the noise in the records themselves scatters by.
    const double variance =
        std::max({squares - n * mean * mean, noise * (n - 1.0) / n, 0.0}) / (n - 1.0);
    const double spread = hann_overlap_inflation(log.every_s / log.window_s).amplitude;
    const double error_of_mean = std::sqrt(variance / n * spread) / mean;
    const double t = student_t_quantile(0.975, std::max(1.0, (n - 1.0) / spread));
    return {decibel::from_power_ratio(mean).db(), t * db_per_relative_power * error_of_mean};
}

void lower(interval_estimate& level, double by_db, double more_u95_db) {
    const double low = std::hypot(level.value - level.low95, more_u95_db);
    const double high = std::hypot(level.high95 - level.value, more_u95_db);
    // A bound alone has no middle to take the distance from.
    level.high95 =
        std::isnan(level.value) ? level.high95 - by_db + more_u95_db : level.value - by_db + high;
    level.value -= by_db;
    level.low95 = level.value - low;
    level.u95 = std::hypot(level.u95, more_u95_db);
}

void lower(line_power& line, double by_db) {
    const decibel gain = decibel::from_db(-by_db);
    line.power *= gain.power_ratio();
    line.sigma *= gain.amplitude_ratio();
}

} // namespace

reference_drift remove_drift(level_log& log, const std::array<reference_span, 2>& spans) {
    reference_drift d;
    std::array<double, 2> middle_s{};
    for (std::size_t k = 0; k < 2; ++k) {
        d.level_dbfs[k] = level_at(log, spans[k]);
        middle_s[k] = 0.5 * (spans[k].from_s + spans[k].until_s);
    }
    d.drift_db = {d.level_dbfs[1].value - d.level_dbfs[0].value,
                  std::hypot(d.level_dbfs[0].u95, d.level_dbfs[1].u95)};
    const double unknown_db = std::hypot(0.5 * d.drift_db.value, d.drift_db.u95);
    for (std::size_t k = 0; k < log.records.size(); ++k) {
        level_record& r = log.records[k];
        const double way = (r.time_s - middle_s[0]) / (middle_s[1] - middle_s[0]);
        const double by_db = d.drift_db.value * std::clamp(way, 0.0, 1.0);
        lower(r.carrier_dbfs, by_db, unknown_db);
        lower(r.tone_dbfs, by_db, unknown_db);
        lower(r.carrier, by_db);
        lower(r.tone, by_db);
        if (!log.detector_tone_dbfs.empty()) {
            log.detector_tone_dbfs[k] -= by_db;
        }
    }
    log.common_u95_db = std::hypot(log.common_u95_db, unknown_db);
    return d;
}

sheet describe(const reference_drift& d) {
    sheet s;
    s.add("first_dbfs", "dBFS", d.level_dbfs[0]);
    s.add("second_dbfs", "dBFS", d.level_dbfs[1]);
    s.add("drift_db", "dB", d.drift_db);
    return s;
}

} // namespace tonewalk
