// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/report/json_report.hpp"

#include <map>

#include <fmt/format.h>

#include "json_stream.hpp"

namespace tonewalk {
namespace {

void write_members(json_stream&, const sheet&);

void write_object(json_stream& json, const sheet& page) {
    json.begin_object();
    write_members(json, page);
    json.end();
}

void write_list(json_stream& json, const std::vector<sheet>& parts) {
    json.begin_list();
    for (const sheet& part : parts)
        write_object(json, part);
    json.end();
}

void write_columns(json_stream& json, const sheet_table& table) {
    json.begin_object();
    for (const sheet_column& column : table.columns) {
        json.key(column.key);
        json.begin_wrapped_list();
        for (std::size_t row = 0; row < table.rows; ++row)
            json.value(column.at(row));
        json.end();
    }
    json.end();
}

void write_records(json_stream& json, const sheet_table& table) {
    json.begin_list();
    for (std::size_t row = 0; row < table.rows; ++row) {
        json.begin_inline_object();
        for (const sheet_column& column : table.columns) {
            json.key(column.key);
            json.value(column.at(row));
        }
        json.end();
    }
    json.end();
}

struct item_writer {
    json_stream& json;
    void operator()(const sheet_entry& entry) const {
        json.key(entry.key);
        json.value(entry.value);
    }
    void operator()(const sheet_table& table) const {
        json.key(table.key);
        table.form == table_form::as_columns ? write_columns(json, table)
                                             : write_records(json, table);
    }
    void operator()(const sheet_group& group) const {
        json.key(group.key);
        group.list ? write_list(json, group.parts) : write_object(json, group.parts.front());
    }
};

void write_members(json_stream& json, const sheet& page) {
    for (const auto& item : page.items)
        std::visit(item_writer{json}, item);
}

/// To the nanosecond, without trailing zeros.
std::string shortest_utc(utc_time time) {
    std::string text = format_utc(time, 9);
    text.pop_back(); // Z
    text.erase(text.find_last_not_of('0') + 1);
    if (text.back() == '.')
        text.pop_back();
    return text + 'Z';
}

sheet described(const recording_summary& recording) {
    const auto time = recording.start_utc ? cell{shortest_utc(*recording.start_utc)} : cell{};
    const auto hash = recording.sha512.empty() ? cell{} : cell{recording.sha512};
    sheet page;
    page.add("name", "", cell{recording.name});
    page.add("format", "", cell{recording.format});
    page.add("sample_rate_hz", "Hz", cell{recording.sample_rate_hz});
    page.add("centre_hz", "Hz", cell{recording.centre_hz.value_or(not_measured)});
    page.add("start_utc", "", time);
    page.add("samples", "", cell{recording.samples});
    page.add("duration_s", "s", cell{recording.duration_s});
    page.add("span_s", "s", cell{recording.span_s});
    page.add("sha512", "", hash);
    page.add("partial", "", cell{recording.partial});
    return page;
}

void write_head(json_stream& json, const report_context& context) {
    json.key("tonewalk");
    json.begin_inline_object();
    json.key("version");
    json.text(context.version);
    json.key("schema");
    json.whole(json_schema_version);
    json.end();
    json.key("command");
    json.begin_wrapped_list();
    for (const std::string& word : context.command)
        json.text(word);
    json.end();
    json.key("job");
    json.text(context.job);
}

void write_recordings(json_stream& json, const std::vector<recording_summary>& recordings) {
    json.key("recording");
    recordings.empty() ? json.null() : write_object(json, described(recordings.front()));
    if (recordings.size() < 2)
        return;
    json.key("recordings");
    json.begin_list();
    for (const recording_summary& each : recordings)
        write_object(json, described(each));
    json.end();
}

void write_optional(json_stream& json, std::string_view key, const std::optional<sheet>& page) {
    json.key(key);
    page ? write_object(json, *page) : json.null();
}

void write_numbers(json_stream& json, std::string_view key, const std::vector<double>& numbers) {
    json.key(key);
    json.begin_wrapped_list();
    for (const double each : numbers)
        json.number(each);
    json.end();
}

void write_curve(json_stream& json, const curve& drawn) {
    json.begin_object();
    json.key("kind");
    json.text(drawn.kind);
    const auto axis = [&](std::string_view name, const std::string& unit,
                          const std::vector<double>& numbers) {
        json.key(fmt::format("{}_unit", name));
        json.text(unit);
        write_numbers(json, name, numbers);
    };
    axis("x", drawn.x_unit, drawn.x);
    axis("y", drawn.y_unit, drawn.y);
    if (!drawn.z.empty())
        axis("z", drawn.z_unit, drawn.z);
    json.end();
}

void write_curves(json_stream& json, const sheet& page, std::map<std::string, int>& used) {
    for (const curve& each : page.curves) {
        const int times = ++used[each.name];
        json.key(times == 1 ? each.name : fmt::format("{}_{}", each.name, times));
        write_curve(json, each);
    }
    for (const auto& item : page.items)
        if (const auto* group = std::get_if<sheet_group>(&item))
            for (const sheet& part : group->parts)
                write_curves(json, part, used);
}

void write_notes(json_stream& json, const note_set& notes) {
    json.begin_list();
    for (const note& each : notes.all()) {
        json.begin_object();
        json.key("code");
        json.text(name(each.code));
        json.key("severity");
        json.text(name(each.level));
        json.key("text");
        json.text(each.text);
        json.key("advice");
        json.text(each.advice);
        json.end();
    }
    json.end();
}

} // namespace

void write_json(output_file& out, const report_context& context, const sheet& result,
                json_report_options options) {
    json_stream json{out};
    json.begin_object();
    write_head(json, context);
    write_recordings(json, context.recordings);
    write_optional(json, "signal", context.signal);
    write_optional(json, "kit", context.kit);
    json.key("result");
    write_object(json, result);
    if (options.curves) {
        json.key("curves");
        json.begin_object();
        std::map<std::string, int> used;
        write_curves(json, result, used);
        json.end();
    }
    json.key("verdicts");
    write_list(json, context.verdicts);
    json.key("notes");
    write_notes(json, context.notes);
    json.key("cautions");
    json.begin_list();
    for (const std::string& line : context.cautions)
        json.text(line);
    json.end();
    json.end();
}

} // namespace tonewalk
