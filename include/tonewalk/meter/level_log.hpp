// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstdint>
#include <optional>
#include <string>
#include <vector>

#include "tonewalk/base/estimate.hpp"
#include "tonewalk/base/note.hpp"
#include "tonewalk/base/sheet.hpp"
#include "tonewalk/base/time.hpp"

namespace tonewalk {

/// What extrema and readings are taken from.
enum class quantity { carrier, tone };

/// Marks of one record, shown in the column "flags".
enum record_flag : std::uint32_t {
    flag_non_finite = 1U << 0,          ///< non-finite-samples: all null
    flag_not_held = 1U << 1,            ///< segments-skipped: all null
    flag_weak_carrier = 1U << 2,        ///< weak-carrier: not detected, floor-limited
    flag_weak_tone = 1U << 3,           ///< weak-tone: not detected, floor-limited
    flag_envelope_suppressed = 1U << 4, ///< an envelope would read the tone 0.1 dB or more low
    flag_background_limited = 1U << 5,  ///< the transmitter-off recording could hide it: a bound
};
[[nodiscard]] std::string flag_words(std::uint32_t flags);

/// One line's power in one record, noise taken off, kept linear and signed: means and fits use it.
struct line_power {
    double power = not_measured; ///< amplitude^2, full scale = 1; may be negative
    double sigma = not_measured; ///< standard deviation of the amplitude, from noise alone
    bool detected = false;       ///< p = 1e-3 a record
};

/// One record of the level log: one window. 224 bytes.
struct level_record {
    double time_s =
        0.0; ///< of the window's centre, from the recording's first sample, gaps included
    std::uint32_t stretch = 0;
    std::uint32_t flags = 0;
    line_power carrier, tone; ///< tone: of the tone's amplitude in the envelope
    interval_estimate carrier_dbfs, tone_dbfs, depth_percent;
    double noise_power = not_measured;       ///< N: of one Hann line, full scale^2
    double tone_snr_db = not_measured;       ///< tone power over 4 N
    double carrier_offset_hz = not_measured; ///< the smooth curve, from the recording's centre
};

/// The series of records of one carrier, with what is common to them.
struct level_log {
    std::vector<level_record> records;
    double every_s = 0.1, window_s = 0.2;    ///< of the samples in use
    double carrier_offset_hz = not_measured; ///< power-weighted mean of the curve
    double tone_hz = not_measured;           ///< refined over all records; NaN without a tone
    double width_hz = 0.0;                   ///< flat width of the channel
    double common_u95_db = 0.0; ///< part of every level's interval that all levels share
    double carrier_bound = 0.0, tone_bound = 0.0; ///< likewise, an amplitude: of a background
    std::optional<utc_time> start_utc;            ///< of the recording's first sample
    std::vector<double> detector_tone_dbfs;       ///< one a record, or empty
    std::string detector_column;                  ///< its JSON name
    note_set doubts;
    curve strip; ///< channel power against time and frequency

    [[nodiscard]] bool has_tone() const noexcept { return tone_hz == tone_hz; }
    [[nodiscard]] double noise_bandwidth_hz() const noexcept { return 1.5 / window_s; }
};

/// The line of `record` that `which` names.
[[nodiscard]] const line_power& line_of(const level_record&, quantity) noexcept;
[[nodiscard]] const interval_estimate& level_of(const level_record&, quantity) noexcept;

/// A level that was fitted to several records, with the doubts that all levels of the log share.
[[nodiscard]] interval_estimate with_common_doubts(const interval_estimate&, const level_log&,
                                                   quantity) noexcept;

/// Levels over the whole log; undetected records count as lowest, null records not at all. A
/// quantile that falls on an undetected record is null with the largest bound of such records as
/// high95.
struct level_summary {
    double max_dbfs = not_measured, median_dbfs = not_measured, min_dbfs = not_measured;
    double p10_dbfs = not_measured, p90_dbfs = not_measured;
    double median_high95 = not_measured, min_high95 = not_measured, p10_high95 = not_measured,
           p90_high95 = not_measured, max_high95 = not_measured;
    double swing_db = not_measured;       ///< max - min
    double swing_at_least = not_measured; ///< where the minimum is floor-limited: max - its bound
    std::size_t records = 0, undetected = 0;
};
[[nodiscard]] level_summary summarise(const level_log&, quantity);
[[nodiscard]] sheet describe(const level_summary&);

/// interval_s, window_s, noise_bandwidth_hz, the medians over detected records and the table "log",
/// whose columns look at the log; the curves "log" (thinned to some 2000 points, extremes kept) and
/// "strip".
[[nodiscard]] sheet describe(const level_log&);

} // namespace tonewalk
