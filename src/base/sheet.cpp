// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/base/sheet.hpp"

#include <algorithm>
#include <iterator>

#include <utility>

namespace tonewalk {

sheet& sheet::add(std::string key, std::string unit, cell value) {
    items.emplace_back(sheet_entry{std::move(key), std::move(unit), std::move(value)});
    return *this;
}

sheet& sheet::add(std::string key, std::string unit, const estimate& measured) {
    add(key, unit, cell{measured.value});
    return add(std::move(key) + "_u95", std::move(unit), cell{measured.u95});
}

sheet& sheet::add(std::string key, std::string unit, const interval_estimate& measured) {
    add(key, unit, cell{measured.value});
    add(key + "_low95", unit, cell{measured.low95});
    add(key + "_high95", unit, cell{measured.high95});
    return add(std::move(key) + "_u95", std::move(unit), cell{measured.u95});
}

sheet& sheet::add(sheet_table table) {
    items.emplace_back(std::move(table));
    return *this;
}

sheet& sheet::add(std::string key, sheet part) {
    sheet_group group{std::move(key), {}, false};
    group.parts.push_back(std::move(part));
    items.emplace_back(std::move(group));
    return *this;
}

sheet& sheet::add(curve drawn) {
    curves.push_back(std::move(drawn));
    return *this;
}

sheet& sheet::join(sheet part) {
    std::move(part.items.begin(), part.items.end(), std::back_inserter(items));
    std::move(part.curves.begin(), part.curves.end(), std::back_inserter(curves));
    return *this;
}

const cell* sheet::find(std::string_view key) const noexcept {
    for (const auto& item : items) {
        const auto* entry = std::get_if<sheet_entry>(&item);
        if (entry != nullptr && entry->key == key)
            return &entry->value;
    }
    return nullptr;
}

} // namespace tonewalk
