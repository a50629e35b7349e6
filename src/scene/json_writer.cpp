// SPDX-License-Identifier: GPL-3.0-or-later
#include "json_writer.hpp"

#include <cmath>
#include <utility>

#include <fmt/core.h>

#include "tonewalk/base/text.hpp"

namespace tonewalk {

void json_writer::place(std::string_view key) {
    if (!closers_.empty())
        text_ += first_ ? "\n" : ",\n";
    text_.append(2 * closers_.size(), ' ');
    first_ = false;
    if (key.empty())
        return;
    text_ += json_string(key);
    text_ += ": ";
}

void json_writer::put_number(double value) {
    if (std::isfinite(value))
        text_ += fmt::format("{}", value);
    else
        text_ += "null";
}

json_writer& json_writer::begin_object(std::string_view key) {
    place(key);
    text_ += '{';
    closers_ += '}';
    first_ = true;
    return *this;
}

json_writer& json_writer::begin_array(std::string_view key) {
    place(key);
    text_ += '[';
    closers_ += ']';
    first_ = true;
    return *this;
}

json_writer& json_writer::end() {
    const char closer = closers_.back();
    closers_.pop_back();
    if (!first_) {
        text_ += '\n';
        text_.append(2 * closers_.size(), ' ');
    }
    text_ += closer;
    if (closers_.empty())
        text_ += '\n';
    first_ = false;
    return *this;
}

json_writer& json_writer::number(std::string_view key, double value) {
    place(key);
    put_number(value);
    return *this;
}

json_writer& json_writer::number(std::string_view key, std::optional<double> value) {
    return value ? number(key, *value) : null(key);
}

json_writer& json_writer::whole(std::string_view key, std::int64_t value) {
    place(key);
    text_ += std::to_string(value);
    return *this;
}

json_writer& json_writer::yes_no(std::string_view key, bool value) {
    place(key);
    text_ += value ? "true" : "false";
    return *this;
}

json_writer& json_writer::text(std::string_view key, std::string_view value) {
    place(key);
    text_ += json_string(value);
    return *this;
}

json_writer& json_writer::null(std::string_view key) {
    place(key);
    text_ += "null";
    return *this;
}

json_writer& json_writer::element(double value) {
    if (!first_)
        text_ += ", ";
    first_ = false;
    put_number(value);
    return *this;
}

std::string json_writer::take() {
    return std::exchange(text_, {});
}

} // namespace tonewalk
