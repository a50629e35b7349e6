// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/recording/sigmf_metadata.hpp"

#include <algorithm>
#include <cmath>
#include <set>

#include <fmt/format.h>
#include <nlohmann/json.hpp>

#include "tonewalk/base/error.hpp"
#include "tonewalk/base/text.hpp"

namespace tonewalk {
namespace {

using json = nlohmann::json;

constexpr std::int64_t highest_index = std::int64_t{1}
                                       << 53; // whole numbers that any writer can hold
constexpr std::int64_t most_lanes = 1024;
constexpr std::string_view correct_it = "correct the metadata";

// One object of the metadata, read field by field with every type and range checked.
class object_reader {
public:
    object_reader(const json& object, std::string where)
        : object_{object}, where_{std::move(where)} {
        if (!object_.is_object())
            throw error{fault::malformed, "must be an object", where_, correct_it};
    }

    [[noreturn]] void fail(std::string_view key, std::string_view what,
                           std::string_view mend = correct_it,
                           fault kind = fault::malformed) const {
        throw error{kind, what, fmt::format("{}, {}", where_, key), mend};
    }

    const json* find(const char* key) const {
        const auto at = object_.find(key);
        return at == object_.end() ? nullptr : &*at;
    }

    const json& array(const char* key) const {
        const json* const found = find(key);
        if (!found)
            fail(key, "is missing", fmt::format("add \"{}\": []", key));
        if (!found->is_array())
            fail(key, "must be an array");
        return *found;
    }

    std::optional<std::string> text(const char* key) const {
        const json* const found = find(key);
        if (!found)
            return std::nullopt;
        if (!found->is_string())
            fail(key, "must be a text");
        return found->get<std::string>();
    }

    std::optional<bool> flag(const char* key) const {
        const json* const found = find(key);
        if (!found)
            return std::nullopt;
        if (!found->is_boolean())
            fail(key, "must be true or false");
        return found->get<bool>();
    }

    std::optional<double> number(const char* key, double lowest, double highest) const {
        const json* const found = find(key);
        if (!found)
            return std::nullopt;
        if (!found->is_number())
            fail(key, "must be a number");
        const auto value = found->get<double>();
        if (!(value >= lowest && value <= highest))
            fail(key, fmt::format("must lie from {:g} to {:g}", lowest, highest));
        return value;
    }

    std::optional<std::int64_t> whole(const char* key, std::int64_t lowest,
                                      std::int64_t highest) const {
        // Up to 2^53 a double holds every whole number, and larger ones fail the range.
        const auto value = number(key, static_cast<double>(lowest), static_cast<double>(highest));
        if (!value)
            return std::nullopt;
        if (*value != std::trunc(*value))
            fail(key, "must be a whole number");
        return static_cast<std::int64_t>(*value);
    }

    template <class Value>
    Value required(const char* key, std::optional<Value> value) const {
        if (!value)
            fail(key, "is missing");
        return std::move(*value);
    }

private:
    const json& object_;
    std::string where_;
};

// Refuses a name that stands twice in one object, where the library would keep the last one
// silently.
class duplicate_watch {
public:
    explicit duplicate_watch(std::string_view file) : file_{file} {}

    bool operator()(int, json::parse_event_t event, json& parsed) {
        if (event == json::parse_event_t::object_start)
            names_.emplace_back();
        else if (event == json::parse_event_t::object_end)
            names_.pop_back();
        else if (event == json::parse_event_t::key && !names_.back().insert(parsed).second)
            throw error{fault::malformed,
                        fmt::format("{} stands twice in one object",
                                    in_quotes(parsed.get_ref<const std::string&>())),
                        file_, "keep one of them"};
        return true;
    }

private:
    std::string_view file_;
    std::vector<std::set<std::string>> names_;
};

json parse_json(std::string_view text, std::string_view name) {
    refuse_utf16(text, name);
    duplicate_watch watch{name};
    try {
        return json::parse(text, [&](int depth, json::parse_event_t event, json& parsed) {
            return watch(depth, event, parsed);
        });
    } catch (const json::parse_error& failure) {
        throw error{fault::malformed, "is no valid JSON",
                    fmt::format("{}, byte {}", name, failure.byte),
                    "correct the text there, or copy the file again"};
    } catch (const json::exception&) { // a number that no double holds
        throw error{fault::malformed, "holds a number beyond all range", name, correct_it};
    }
}

bool is_version(std::string_view text) {
    const auto dots = std::count(text.begin(), text.end(), '.');
    const bool edges = !text.empty() && text.front() != '.' && text.back() != '.';
    return dots == 2 && edges && text.find("..") == text.npos &&
           text.find_first_not_of("0123456789.") == text.npos;
}

void check_version(const object_reader& global) {
    const std::string version = global.required("core:version", global.text("core:version"));
    if (!is_version(version))
        global.fail("core:version", fmt::format("must read like 1.2.5, is {}", in_quotes(version)));
    const auto major = std::string_view{version}.substr(0, version.find('.'));
    if (major.find_first_not_of('0') != major.npos && major != "1")
        global.fail("core:version",
                    fmt::format("{} is newer than what is understood", in_quotes(version)),
                    "write the metadata in version 1", fault::unsupported);
}

void check_extensions(const object_reader& global, std::string_view name) {
    if (!global.find("core:extensions"))
        return;
    const json& extensions = global.array("core:extensions");
    for (std::size_t k = 0; k < extensions.size(); ++k) {
        const object_reader extension{extensions[k],
                                      fmt::format("{}, core:extensions[{}]", name, k)};
        const auto title = extension.required("name", extension.text("name"));
        (void)extension.required("version", extension.text("version"));
        if (!extension.required("optional", extension.flag("optional")))
            extension.fail(
                "name",
                fmt::format("the extension {} must be understood and is not", in_quotes(title)),
                "set its optional to true if the samples are stored as usual", fault::unsupported);
    }
}

std::string read_sha512(const object_reader& global) {
    const auto written = global.text("core:sha512");
    if (!written)
        return {};
    std::string hex = lower_case(*written);
    if (hex.size() != 128 || hex.find_first_not_of("0123456789abcdef") != hex.npos)
        global.fail("core:sha512", "must be 128 hex digits");
    return hex;
}

std::string read_dataset(const object_reader& global) {
    const auto dataset = global.text("core:dataset");
    if (!dataset)
        return {};
    const bool plain = !dataset->empty() && *dataset != "." && *dataset != ".." &&
                       dataset->find('/') == dataset->npos && dataset->find('\0') == dataset->npos;
    if (!plain)
        global.fail("core:dataset",
                    fmt::format("must name a file in the same folder, is {}", in_quotes(*dataset)));
    return *dataset;
}

sigmf_metadata read_global(const object_reader& global) {
    sigmf_metadata read;
    read.datatype = global.required("core:datatype", global.text("core:datatype"));
    read.format = parse_sample_format(read.datatype);
    read.sample_rate_hz = global.number("core:sample_rate", 1.0, 1e12);
    read.lanes =
        static_cast<unsigned>(global.whole("core:num_channels", 1, most_lanes).value_or(1));
    read.offset = global.whole("core:offset", 0, highest_index).value_or(0);
    read.sha512 = read_sha512(global);
    read.dataset = read_dataset(global);
    read.metadata_only = global.flag("core:metadata_only").value_or(false);
    read.trailing_bytes = global.whole("core:trailing_bytes", 0, highest_index).value_or(0);
    return read;
}

unsigned decimals_of(std::string_view time) {
    const auto point = time.find('.');
    if (point == time.npos)
        return 0;
    const auto end = time.find_first_not_of("0123456789", point + 1);
    return static_cast<unsigned>(std::min(end, time.size()) - point - 1);
}

void read_time(const object_reader& entry, sigmf_capture& capture) {
    const auto written = entry.text("core:datetime");
    if (!written)
        return;
    capture.start_utc = parse_utc(*written);
    if (!capture.start_utc)
        entry.fail("core:datetime",
                   fmt::format("must read like 2026-05-04T09:30:00Z, is {}", in_quotes(*written)));
    capture.utc_decimals = decimals_of(*written);
}

sigmf_capture read_capture(const object_reader& entry) {
    sigmf_capture capture;
    capture.sample_start =
        entry.required("core:sample_start", entry.whole("core:sample_start", 0, highest_index));
    capture.global_index = entry.whole("core:global_index", 0, highest_index);
    capture.centre_hz = entry.number("core:frequency", -1e12, 1e12);
    capture.header_bytes = entry.whole("core:header_bytes", 0, highest_index).value_or(0);
    read_time(entry, capture);
    return capture;
}

std::vector<sigmf_capture> read_captures(const json& entries, sample_index offset,
                                         std::string_view name) {
    std::vector<sigmf_capture> captures;
    captures.reserve(entries.size());
    for (std::size_t k = 0; k < entries.size(); ++k) {
        const object_reader entry{entries[k], fmt::format("{}, captures[{}]", name, k)};
        captures.push_back(read_capture(entry));
        const sample_index start = captures.back().sample_start;
        if (start < offset)
            entry.fail("core:sample_start", "lies before core:offset");
        if (k > 0 && start < captures[k - 1].sample_start)
            entry.fail("core:sample_start", "is lower than the entry's before",
                       "sort the captures by it");
    }
    return captures;
}

} // namespace

sigmf_metadata parse_sigmf_metadata(std::string_view text, std::string_view name) {
    const json parsed = parse_json(text, name);
    const object_reader root{parsed, std::string{name}};
    const json* const global_object = root.find("global");
    if (!global_object)
        root.fail("global", "is missing");
    const object_reader global{*global_object, fmt::format("{}, global", name)};
    check_version(global);
    check_extensions(global, name);
    sigmf_metadata read = read_global(global);
    read.captures = read_captures(root.array("captures"), read.offset, name);
    (void)root.array("annotations");
    return read;
}

} // namespace tonewalk
