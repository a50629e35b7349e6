// SPDX-License-Identifier: GPL-3.0-or-later
#include "json_stream.hpp"

#include <cassert>
#include <cmath>

#include <fmt/core.h>

#include "tonewalk/base/text.hpp"

namespace tonewalk {
namespace {

constexpr std::size_t line_length = 100;

} // namespace

void json_stream::begin(layout form, char opening, char closing) {
    if (!levels_.empty() && levels_.back().form == layout::one_line)
        form = layout::one_line;
    put({&opening, 1});
    levels_.push_back({form, closing});
}

void json_stream::end() {
    assert(!levels_.empty() && !after_key_);
    const level ending = levels_.back();
    levels_.pop_back();
    if (ending.form == layout::lines && !ending.empty)
        new_line(levels_.size());
    emit({&ending.closing, 1});
    if (levels_.empty())
        emit("\n");
}

void json_stream::key(std::string_view name) {
    assert(!levels_.empty() && levels_.back().closing == '}' && !after_key_);
    const std::string shown = json_string(name) + ": ";
    separate(shown.size());
    emit(shown);
    after_key_ = true;
}

void json_stream::value(const cell& held) {
    struct writer {
        json_stream& json;
        void operator()(std::monostate) const { json.null(); }
        void operator()(bool yes) const { json.truth(yes); }
        void operator()(std::int64_t count) const { json.whole(count); }
        void operator()(double figure) const { json.number(figure); }
        void operator()(const std::string& words) const { json.text(words); }
    };
    std::visit(writer{*this}, held);
}

void json_stream::text(std::string_view words) {
    put(json_string(words));
}

void json_stream::number(double figure) {
    if (!std::isfinite(figure))
        return null();
    put(fmt::format("{}", figure));
}

void json_stream::whole(std::int64_t count) {
    put(std::to_string(count));
}

void json_stream::truth(bool yes) {
    put(yes ? "true" : "false");
}

void json_stream::null() {
    put("null");
}

void json_stream::put(std::string_view token) {
    assert(levels_.empty() || levels_.back().closing == ']' || after_key_);
    if (!after_key_)
        separate(token.size());
    after_key_ = false;
    emit(token);
}

void json_stream::separate(std::size_t size) {
    if (levels_.empty())
        return;
    level& inside = levels_.back();
    if (!inside.empty)
        emit(",");
    const bool overflows = inside.form == layout::wrapped && column_ + 1 + size > line_length;
    if (inside.form == layout::lines || (overflows && !inside.empty))
        new_line(levels_.size());
    else if (!inside.empty)
        emit(" ");
    inside.empty = false;
}

void json_stream::new_line(std::size_t depth) {
    emit("\n");
    column_ = 0;
    emit(std::string(2 * depth, ' '));
}

void json_stream::emit(std::string_view token) {
    out_.write(token);
    column_ += token.size();
}

} // namespace tonewalk
