// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cmath>
#include <filesystem>
#include <string>
#include <vector>

#include "support/temporary_folder.hpp"
#include "tonewalk/report/json_report.hpp"

namespace tonewalk::test {

/// The result of a walk as `levels` gives it: three records, one of them undetected, one extremum.
inline sheet sample_result() {
    const auto column = [](std::string key, std::string unit, std::vector<double> values) {
        return sheet_column{std::move(key), std::move(unit),
                            [values](std::size_t row) { return cell{values[row]}; }};
    };
    const auto words = [](std::string key, std::vector<std::string> values) {
        return sheet_column{std::move(key), "",
                            [values](std::size_t row) { return cell{values[row]}; }};
    };
    const double nothing = not_measured;
    sheet_table log{"log", 3, {}, table_form::as_columns};
    log.columns = {
        column("time_s", "s", {0.1, 0.2, 0.3}),
        words("utc",
              {"2026-05-04T09:30:00.100Z", "2026-05-04T09:30:00.200Z", "2026-05-04T09:30:00.300Z"}),
    };
    for (const std::string level : {"carrier_dbfs", "tone_dbfs"}) {
        log.columns.push_back(column(level, "dBFS", {-20.5, nothing, -1.0 / 3.0}));
        log.columns.push_back(column(level + "_low95", "dBFS", {-20.6, nothing, -0.4}));
        log.columns.push_back(column(level + "_high95", "dBFS", {-20.4, -60.0, -0.3}));
        log.columns.push_back(column(level + "_u95", "dBFS", {0.1, nothing, nothing}));
    }
    log.columns.push_back(column("depth_percent", "%", {30.0, nothing, 29.9}));
    log.columns.push_back(column("tone_snr_db", "dB", {40.0, nothing, 60.0}));
    log.columns.push_back(column("noise_dbfs_hz", "dBFS/Hz", {-110.0, -110.1, -INFINITY}));
    log.columns.push_back(column("carrier_offset_hz", "Hz", {1000.5, 1000.5, 1000.5}));
    log.columns.push_back(words("flags", {"", "weak-tone floor-limited", ""}));

    sheet_table extrema{"extrema", 1, {}, table_form::as_records};
    extrema.columns = {words("kind", {"null"}),
                       column("time_s", "s", {0.2}),
                       column("time_s_u95", "s", {0.01}),
                       column("level_dbfs", "dBFS", {nothing}),
                       column("level_dbfs_low95", "dBFS", {nothing}),
                       column("level_dbfs_high95", "dBFS", {-60.0}),
                       column("prominence_db", "dB", {20.0}),
                       {"floor_limited", "", [](std::size_t) { return cell{true}; }}};

    sheet summary;
    summary.add("max_dbfs", "dBFS", cell{-0.3}).add("median_dbfs", "dBFS", cell{-20.5});
    summary.add("min_dbfs", "dBFS", interval_estimate{nothing, nothing, -60.0, nothing});
    summary.add("p10_dbfs", "dBFS", interval_estimate{nothing, nothing, -60.0, nothing});
    summary.add("p90_dbfs", "dBFS", cell{-4.0}).add("swing_db", "dB", cell{59.7});
    summary.add("swing_at_least", "dB", cell{not_measured});

    sheet result;
    result.add("interval_s", "s", cell{0.1}).add("window_s", "s", cell{0.2});
    result.add("noise_bandwidth_hz", "Hz", cell{7.5});
    result.add("carrier_median_dbfs", "dBFS", cell{-10.0});
    result.add("tone_median_dbfs", "dBFS", cell{-20.5});
    result.add("depth_median_percent", "%", cell{30.0});
    result.add("noise_median_dbfs_hz", "dBFS/Hz", cell{not_measured});
    result.add("summary", std::move(summary)).add(std::move(extrema)).add(std::move(log));
    result.add(
        curve{"spectrum", "line", "Hz", "dBFS", "", {-1.0, 0.0, 1.0}, {-80.0, nothing, -80.5}, {}});
    result.add(
        curve{"strip", "strip", "Hz", "s", "dBFS", {-1.0, 1.0}, {0.1, 0.2}, {-80, -81, -82, -83}});
    result.add(curve{"log", "line", "s", "dBFS", "", {0.1, 0.2}, {-20.5, nothing}, {}});
    return result;
}

inline report_context sample_context() {
    report_context context;
    context.version = "0.1.0";
    context.command = {"tonewalk", "levels", "w\xC3\xA4lk.iq", "--json", "-"};
    context.job = "levels";
    recording_summary recording;
    recording.name = "w\xC3\xA4lk.iq";
    recording.format = "ci16_le";
    recording.sample_rate_hz = 2.4e6;
    recording.centre_hz = 145e6;
    recording.start_utc = parse_utc("2026-05-04T09:30:00.5Z");
    recording.samples = 2'400'000;
    recording.duration_s = recording.span_s = 1.0;
    context.recordings.push_back(recording);
    sheet signal;
    signal.add("carrier_hz", "Hz", cell{145001000.5}).add("carrier_offset_hz", "Hz", cell{1000.5});
    signal.add("tone_hz", "Hz", cell{1000.0}).add("channel_width_hz", "Hz", cell{6000.0});
    signal.add("detector", "", cell{}).add("quantity", "", cell{std::string{"tone"}});
    context.signal = std::move(signal);
    context.notes.add(
        {note_code::weak_tone, severity::warning, "33 % of the records hold no tone", "go closer"});
    return context;
}

inline std::string json_of(const report_context& context, const sheet& result,
                           json_report_options options = {}) {
    const temporary_folder folder;
    output_file file{folder / "result.json"};
    write_json(file, context, result, options);
    file.commit();
    return read_file(folder / "result.json");
}

} // namespace tonewalk::test
