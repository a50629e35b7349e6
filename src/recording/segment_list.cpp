// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/recording/segment_list.hpp"

#include <memory>

namespace tonewalk {
namespace {

/// One run of samples, or of lost ones.
struct span_of_time {
    sample_index first = 0, position = 0, count = 0;
    std::optional<double> centre_hz;
};
using spans = std::shared_ptr<const std::vector<span_of_time>>;

template <class Value>
sheet_column column(const spans& rows, const char* key, const char* unit, Value value) {
    return {key, unit, [rows, value](std::size_t row) { return cell{value((*rows)[row])}; }};
}

sheet_table table_of(const char* key, const spans& rows, double rate_hz) {
    sheet_table t;
    t.key = key;
    t.form = table_form::as_records;
    t.rows = rows->size();
    const auto seconds = [rate_hz](sample_index n) { return static_cast<double>(n) / rate_hz; };
    t.columns.push_back(column(rows, "time_s", "s",
                               [seconds](const span_of_time& s) { return seconds(s.position); }));
    t.columns.push_back(column(rows, "duration_s", "s",
                               [seconds](const span_of_time& s) { return seconds(s.count); }));
    t.columns.push_back(column(rows, "samples", "", [](const span_of_time& s) {
        return static_cast<std::int64_t>(s.count);
    }));
    return t;
}

sheet_table segments_of(const stream_facts& facts, const spans& rows) {
    sheet_table t = table_of("segments", rows, facts.sample_rate_hz);
    t.columns.push_back(column(rows, "first_sample", "", [](const span_of_time& s) {
        return static_cast<std::int64_t>(s.first);
    }));
    t.columns.push_back(column(rows, "centre_hz", "Hz", [](const span_of_time& s) {
        return s.centre_hz ? cell{*s.centre_hz} : cell{};
    }));
    const auto start = facts.start_utc;
    const double rate_hz = facts.sample_rate_hz;
    t.columns.push_back(column(rows, "start_utc", "", [start, rate_hz](const span_of_time& s) {
        return start ? cell{format_utc(moved_by(*start, static_cast<double>(s.position) / rate_hz),
                                       6)}
                     : cell{};
    }));
    return t;
}

} // namespace

sheet describe_segments(const stream_facts& facts, sample_index measured) {
    std::vector<span_of_time> segments, gaps;
    for (const stretch_facts& stretch : facts.stretches) {
        if (!segments.empty()) {
            const span_of_time& last = segments.back();
            const sample_index end = last.position + last.count;
            if (stretch.position > end) {
                gaps.push_back({0, end, stretch.position - end, {}});
            }
        }
        segments.push_back(
            {stretch.first, stretch.position, stretch.count.value_or(measured), stretch.centre_hz});
    }
    sheet s;
    s.add(segments_of(facts, std::make_shared<const std::vector<span_of_time>>(segments)));
    s.add(table_of("gaps", std::make_shared<const std::vector<span_of_time>>(gaps),
                   facts.sample_rate_hz));
    return s;
}

} // namespace tonewalk
