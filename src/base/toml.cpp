// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/base/toml.hpp"

#include <algorithm>
#include <cmath>
#include <map>
#include <sstream>
#include <utility>
#include <variant>

#include <fmt/format.h>
#include <toml++/toml.h>

#include "tonewalk/base/near_name.hpp"
#include "tonewalk/base/text.hpp"

namespace tonewalk {

struct toml_table::node {
    struct value;
    using list = std::vector<value>;
    using subtable = std::shared_ptr<const node>;
    /// A date-time is kept as its text.
    struct date_time {
        std::string text;
    };
    struct value {
        std::variant<bool, std::int64_t, double, std::string, date_time, list, subtable> held;
        unsigned line = 0;
    };
    struct entry {
        std::string key;
        value content;
        mutable bool asked = false;
    };
    std::shared_ptr<const std::filesystem::path> file;
    std::string path; ///< "carrier[0].tone[1]", empty for the root
    unsigned line = 0;
    std::vector<entry> entries; ///< in file order
    mutable std::vector<std::string> known;
};

namespace {

using node = toml_table::node;

error at_line(const std::filesystem::path& file, unsigned line, std::string_view key,
              std::string_view what, std::string_view mend) {
    const std::string name = valid_utf8(file.string());
    const std::string where = key.empty() ? fmt::format("{}, line {}", name, line)
                                          : fmt::format("{}, line {}, {}", name, line, key);
    return error{fault::malformed, what, where, mend};
}

std::string dotted(std::string_view path, std::string_view key) {
    return path.empty() ? std::string{key} : fmt::format("{}.{}", path, key);
}

std::shared_ptr<node> take_table(const toml::table&, std::shared_ptr<const std::filesystem::path>,
                                 std::string path);

template <typename DateOrTime>
node::date_time date_text(const DateOrTime& value) {
    std::ostringstream text;
    text.imbue(std::locale::classic());
    text << value;
    return {text.str()};
}

/// Copies what the parser found, so that the rest of the program never meets the parser's types.
node::value take_value(const toml::node& found,
                       const std::shared_ptr<const std::filesystem::path>& file,
                       const std::string& path) {
    node::value taken;
    taken.line = found.source().begin.line;
    if (const auto* table = found.as_table()) {
        taken.held = node::subtable{take_table(*table, file, path)};
    } else if (const auto* array = found.as_array()) {
        node::list list;
        for (const toml::node& each : *array)
            list.push_back(take_value(each, file, fmt::format("{}[{}]", path, list.size())));
        taken.held = std::move(list);
    } else if (const auto* yes_no = found.as_boolean()) {
        taken.held = yes_no->get();
    } else if (const auto* whole = found.as_integer()) {
        taken.held = whole->get();
    } else if (const auto* number = found.as_floating_point()) {
        if (!std::isfinite(number->get()))
            throw at_line(*file, taken.line, path, "is not a finite number",
                          "write a plain number");
        taken.held = number->get();
    } else if (const auto* text = found.as_string()) {
        taken.held = text->get();
    } else if (const auto* date_time = found.as_date_time()) {
        taken.held = date_text(date_time->get());
    } else if (const auto* date = found.as_date()) {
        taken.held = date_text(date->get());
    } else if (const auto* time = found.as_time()) {
        taken.held = date_text(time->get());
    }
    return taken;
}

std::shared_ptr<node> take_table(const toml::table& found,
                                 std::shared_ptr<const std::filesystem::path> file,
                                 std::string path) {
    auto taken = std::make_shared<node>();
    taken->file = std::move(file);
    taken->path = std::move(path);
    taken->line = found.source().begin.line;
    for (const auto& [key, value] : found)
        taken->entries.push_back({std::string{key.str()},
                                  take_value(value, taken->file, dotted(taken->path, key.str())),
                                  false});
    // The parser sorts by name; people read from top to bottom.
    std::stable_sort(
        taken->entries.begin(), taken->entries.end(),
        [](const node::entry& a, const node::entry& b) { return a.content.line < b.content.line; });
    return taken;
}

error wrong_value(const node& table, const node::value& value, std::string_view key,
                  std::string_view what, std::string_view mend) {
    return at_line(*table.file, value.line, dotted(table.path, key), what, mend);
}

error missing(const node& table, std::string_view key, std::string_view mend) {
    return at_line(*table.file, table.line, dotted(table.path, key), "is missing", mend);
}

/// The value of a key that the reader knows; remembers that it was asked for.
const node::value* look_up(const node& table, std::string_view key) {
    if (std::find(table.known.begin(), table.known.end(), key) == table.known.end())
        table.known.emplace_back(key);
    for (const node::entry& each : table.entries) {
        if (each.key != key)
            continue;
        each.asked = true;
        return &each.content;
    }
    return nullptr;
}

template <typename Held>
const Held* as(const node::value& value) {
    return std::get_if<Held>(&value.held);
}

std::optional<double> as_number(const node::value& value) {
    if (const auto* number = as<double>(value))
        return *number;
    if (const auto* whole = as<std::int64_t>(value))
        return static_cast<double>(*whole);
    return std::nullopt;
}

template <typename Held>
std::optional<Held> get(const node& table, std::string_view key, std::string_view wanted,
                        std::string_view example) {
    const node::value* const value = look_up(table, key);
    if (value == nullptr)
        return std::nullopt;
    if (const auto* held = as<Held>(*value))
        return *held;
    throw wrong_value(table, *value, key, fmt::format("is not {}", wanted),
                      fmt::format("write it like {} = {}", key, example));
}

void finish_value(const node::value& value);

void finish_table(const node& table) {
    for (const node::entry& each : table.entries) {
        if (!each.asked) {
            std::vector<std::string_view> known{table.known.begin(), table.known.end()};
            throw wrong_value(table, each.content, each.key, "is not known here",
                              name_hint(each.key, known));
        }
        finish_value(each.content);
    }
}

void finish_value(const node::value& value) {
    if (const auto* table = as<node::subtable>(value))
        finish_table(**table);
    else if (const auto* list = as<node::list>(value))
        for (const node::value& each : *list)
            finish_value(each);
}

} // namespace

bool toml_table::has(std::string_view key) const {
    return look_up(*node_, key) != nullptr;
}

std::optional<double> toml_table::number(std::string_view key) const {
    const node::value* const value = look_up(*node_, key);
    if (value == nullptr)
        return std::nullopt;
    const auto number = as_number(*value);
    if (!number)
        throw wrong_value(*node_, *value, key, "is not a number",
                          fmt::format("write it like {} = 1.5", key));
    return number;
}

std::optional<std::int64_t> toml_table::whole(std::string_view key) const {
    return get<std::int64_t>(*node_, key, "a whole number", "10");
}

std::optional<bool> toml_table::yes_no(std::string_view key) const {
    return get<bool>(*node_, key, "true or false", "true");
}

std::optional<std::string> toml_table::text(std::string_view key) const {
    return get<std::string>(*node_, key, "text", "\"...\"");
}

std::optional<utc_time> toml_table::utc(std::string_view key) const {
    const node::value* const value = look_up(*node_, key);
    if (value == nullptr)
        return std::nullopt;
    const auto* const plain = as<std::string>(*value);
    const auto* const dated = as<node::date_time>(*value);
    const auto time = parse_utc(plain != nullptr ? *plain : dated != nullptr ? dated->text : "");
    if (!time)
        throw wrong_value(*node_, *value, key, "is not a date and time with its zone",
                          fmt::format("write it like {} = 2026-05-04T09:30:00Z", key));
    return time;
}

std::optional<std::vector<double>> toml_table::numbers(std::string_view key) const {
    const auto list = get<node::list>(*node_, key, "a list of numbers", "[1.0, 2.5]");
    if (!list)
        return std::nullopt;
    std::vector<double> taken;
    for (const node::value& each : *list) {
        const auto number = as_number(each);
        if (!number)
            throw wrong_value(*node_, each, key, "holds something that is no number",
                              fmt::format("write it like {} = [1.0, 2.5]", key));
        taken.push_back(*number);
    }
    return taken;
}

std::optional<std::vector<std::string>> toml_table::texts(std::string_view key) const {
    const auto list = get<node::list>(*node_, key, "a list of texts", "[\"a\", \"b\"]");
    if (!list)
        return std::nullopt;
    std::vector<std::string> taken;
    for (const node::value& each : *list) {
        const auto* const text = as<std::string>(each);
        if (text == nullptr)
            throw wrong_value(*node_, each, key, "holds something that is no text",
                              fmt::format("write it like {} = [\"a\", \"b\"]", key));
        taken.push_back(*text);
    }
    return taken;
}

std::optional<toml_table> toml_table::table(std::string_view key) const {
    const node::value* const value = look_up(*node_, key);
    if (value == nullptr)
        return std::nullopt;
    if (const auto* held = as<node::subtable>(*value))
        return toml_table{*held};
    throw wrong_value(*node_, *value, key, "is not a table", fmt::format("write [{}]", key));
}

std::vector<toml_table> toml_table::tables(std::string_view key) const {
    const node::value* const value = look_up(*node_, key);
    if (value == nullptr)
        return {};
    if (const auto* single = as<node::subtable>(*value))
        return {toml_table{*single}};
    std::vector<toml_table> taken;
    const auto* const list = as<node::list>(*value);
    const auto refusal = [&](const node::value& at) {
        return wrong_value(*node_, at, key, "is not a list of tables",
                           fmt::format("write [[{}]]", key));
    };
    if (list == nullptr)
        throw refusal(*value);
    for (const node::value& each : *list) {
        const auto* const held = as<node::subtable>(each);
        if (held == nullptr)
            throw refusal(each);
        taken.emplace_back(*held);
    }
    return taken;
}

double toml_table::need_number(std::string_view key, std::string_view example) const {
    const auto found = number(key);
    if (!found)
        throw missing(*node_, key, fmt::format("add {} = {}", key, example));
    return *found;
}

toml_table toml_table::need_table(std::string_view key) const {
    auto found = table(key);
    if (!found)
        throw missing(*node_, key, fmt::format("add a table [{}]", dotted(node_->path, key)));
    return *std::move(found);
}

void toml_table::finish() const {
    finish_table(*node_);
}

error toml_table::wrong(std::string_view key, std::string_view what, std::string_view mend) const {
    const node::value* const value = look_up(*node_, key);
    return at_line(*node_->file, value != nullptr ? value->line : node_->line,
                   dotted(node_->path, key), what, mend);
}

std::vector<std::string> toml_table::keys() const {
    std::vector<std::string> names;
    for (const node::entry& each : node_->entries)
        names.push_back(each.key);
    return names;
}

const std::filesystem::path& toml_table::file() const noexcept {
    return *node_->file;
}

toml_table read_toml(const std::filesystem::path& file) {
    return parse_toml(read_text_file(file), file);
}

toml_table parse_toml(std::string_view text, const std::filesystem::path& name) {
    const auto file = std::make_shared<const std::filesystem::path>(name);
    try {
        return toml_table{take_table(toml::parse(text), file, {})};
    } catch (const toml::parse_error& failure) {
        throw at_line(*file, failure.source().begin.line, {},
                      fmt::format("is not TOML ({})", failure.description()), "mend that line");
    }
}

} // namespace tonewalk
