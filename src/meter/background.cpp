// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/meter/background.hpp"

#include <algorithm>
#include <cmath>

#include <fmt/core.h>

#include "tonewalk/base/decibel.hpp"
#include "tonewalk/base/error.hpp"
#include "tonewalk/maths/distribution.hpp"
#include "tonewalk/maths/window.hpp"

namespace tonewalk {
namespace {

/// Mean power over the records and its standard error from their scatter, neighbours overlapping.
background_line mean_line(const level_log& log, quantity which, double overlap) {
    double n = 0.0, sum = 0.0, squares = 0.0, noise = 0.0;
    for (const level_record& r : log.records) {
        const line_power& line = line_of(r, which);
        if (std::isnan(line.power)) {
            continue;
        }
        n += 1.0;
        sum += line.power;
        squares += line.power * line.power;
        noise += 2.0 * line.sigma * line.sigma; // what one record's noise alone scatters by
    }
    if (n == 0.0) {
        return {};
    }
    const double mean = sum / n;
    const double scatter =
        n > 1.0 ? std::sqrt(std::max(0.0, (squares - n * mean * mean) / (n - 1.0))) : 0.0;
    const double error = std::max(scatter, noise / n) * std::sqrt(overlap / n);
    const bool stands_out = mean > two_sided_95 * error;
    return {stands_out ? mean : 0.0, std::sqrt(std::max(0.0, mean) + two_sided_95 * error)};
}

void add_line(sheet& s, const char* key, const background_line& line) {
    const auto db = [](double amplitude) {
        return amplitude > 0.0 ? decibel::from_amplitude_ratio(amplitude).db() : not_measured;
    };
    s.add(key, "dBFS", db(std::sqrt(line.power)));
    s.add(std::string{key} + "_high95", "dBFS", db(line.bound));
}

} // namespace

background_lines background_of(const level_log& log, const std::string& where) {
    const bool any = std::any_of(log.records.begin(), log.records.end(), [](const level_record& r) {
        return !std::isnan(r.carrier.power);
    });
    if (!any) {
        throw error{fault::malformed, "no record of the background could be measured", where,
                    "record the background with the receiver on the same frequency and rate"};
    }
    const double overlap = hann_overlap_inflation(log.every_s / log.window_s).amplitude;
    background_lines lines;
    lines.carrier = mean_line(log, quantity::carrier, overlap);
    if (log.has_tone()) {
        lines.tone = mean_line(log, quantity::tone, overlap);
    }
    return lines;
}

sheet describe(const background_lines& lines) {
    sheet s;
    add_line(s, "carrier_dbfs", lines.carrier);
    add_line(s, "tone_dbfs", lines.tone);
    return s;
}

bool hidden_by(const background_line& line, double power_left) noexcept {
    return line.power > 0.0 && power_left <= line.bound * line.bound;
}

void add_background_note(level_log& log, quantity used) {
    const auto limited =
        std::count_if(log.records.begin(), log.records.end(), [used](const level_record& r) {
            return (r.flags & flag_background_limited) != 0 && !line_of(r, used).detected;
        });
    if (limited > 0) {
        log.doubts.add({note_code::background_limited, severity::warning,
                        fmt::format("{} of {} levels do not rise over what the recording without "
                                    "the transmitter shows",
                                    limited, log.records.size()),
                        "they are bounds; find out what else sends there, or choose another tone"});
    }
}

} // namespace tonewalk
