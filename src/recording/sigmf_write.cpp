// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/recording/sigmf_write.hpp"

#include <algorithm>
#include <cassert>
#include <cmath>
#include <string_view>

#include <nlohmann/json.hpp>

namespace tonewalk {
namespace {

using nlohmann::ordered_json;

// 2400000 rather than 2400000.0
ordered_json number(double value) {
    constexpr double whole_up_to = 9.007199254740992e15; // 2^53
    if (value == std::trunc(value) && std::abs(value) <= whole_up_to)
        return static_cast<std::int64_t>(value);
    return value;
}

void put_text(ordered_json& object, const char* key, const std::string& text) {
    if (!text.empty())
        object[key] = text;
}

// As many decimals as the time has, in steps of three.
std::string shortest_utc(utc_time time) {
    for (const int decimals : {0, 3, 6}) {
        std::string text = format_utc(time, decimals);
        if (parse_utc(text) == time)
            return text;
    }
    return format_utc(time, 9);
}

ordered_json global_of(const sigmf_document& document) {
    ordered_json global;
    global["core:datatype"] = document.format.name();
    global["core:version"] = "1.2.5";
    global["core:sample_rate"] = number(document.sample_rate_hz);
    if (document.lanes != 1)
        global["core:num_channels"] = document.lanes;
    put_text(global, "core:author", document.author);
    put_text(global, "core:description", document.description);
    put_text(global, "core:recorder", document.recorder);
    put_text(global, "core:hw", document.hardware);
    put_text(global, "core:license", document.licence_uri);
    put_text(global, "core:sha512", document.sha512);
    return global;
}

ordered_json capture_of(const sigmf_segment& segment) {
    ordered_json capture;
    capture["core:sample_start"] = segment.sample_start;
    if (segment.global_index)
        capture["core:global_index"] = *segment.global_index;
    if (segment.centre_hz)
        capture["core:frequency"] = number(*segment.centre_hz);
    if (segment.start_utc)
        capture["core:datetime"] = shortest_utc(*segment.start_utc);
    return capture;
}

ordered_json annotation_of(const sigmf_annotation& remark) {
    ordered_json annotation;
    annotation["core:sample_start"] = remark.sample_start;
    if (remark.sample_count)
        annotation["core:sample_count"] = *remark.sample_count;
    if (remark.span) {
        annotation["core:freq_lower_edge"] = number(remark.span->low_hz);
        annotation["core:freq_upper_edge"] = number(remark.span->high_hz);
    }
    put_text(annotation, "core:label", remark.label);
    put_text(annotation, "core:comment", remark.comment);
    return annotation;
}

template <class Item>
[[maybe_unused]] bool ascending(const std::vector<Item>& items) {
    return std::is_sorted(items.begin(), items.end(), [](const Item& a, const Item& b) {
        return a.sample_start < b.sample_start;
    });
}

} // namespace

std::string sigmf_text(const sigmf_document& document) {
    assert(document.sample_rate_hz >= 1.0 && document.sample_rate_hz <= 1e12);
    assert(document.sha512.empty() || document.sha512.size() == 128);
    assert(ascending(document.segments) && ascending(document.annotations));

    ordered_json root;
    root["global"] = global_of(document);
    root["captures"] = ordered_json::array();
    for (const auto& segment : document.segments)
        root["captures"].push_back(capture_of(segment));
    root["annotations"] = ordered_json::array();
    for (const auto& remark : document.annotations)
        root["annotations"].push_back(annotation_of(remark));
    return root.dump(4, ' ', false, ordered_json::error_handler_t::replace) + "\n";
}

} // namespace tonewalk
