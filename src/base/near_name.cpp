// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/base/near_name.hpp"

#include <algorithm>
#include <cstddef>
#include <vector>

#include <fmt/format.h>
#include <fmt/ranges.h>

#include "tonewalk/base/text.hpp"

namespace tonewalk {
namespace {

/// Slips between two names (optimal string alignment).
std::size_t slips(std::string_view a, std::string_view b) {
    std::vector<std::size_t> before_last(b.size() + 1), last(b.size() + 1), row(b.size() + 1);
    for (std::size_t j = 0; j <= b.size(); ++j)
        row[j] = j;
    for (std::size_t i = 1; i <= a.size(); ++i) {
        std::swap(before_last, last);
        std::swap(last, row);
        row[0] = i;
        for (std::size_t j = 1; j <= b.size(); ++j) {
            const std::size_t change = a[i - 1] == b[j - 1] ? 0 : 1;
            row[j] = std::min({last[j] + 1, row[j - 1] + 1, last[j - 1] + change});
            if (i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1])
                row[j] = std::min(row[j], before_last[j - 2] + 1);
        }
    }
    return row[b.size()];
}

} // namespace

std::string near_name(std::string_view typed, std::span<const std::string_view> names) {
    const std::string wanted = lower_case(typed);
    std::string_view nearest;
    std::size_t fewest = static_cast<std::size_t>(-1);
    for (const std::string_view name : names) {
        const std::size_t count = slips(wanted, lower_case(name));
        if (count < fewest && 3 * count <= std::max(typed.size(), name.size())) {
            fewest = count;
            nearest = name;
        }
    }
    return std::string{nearest};
}

std::string near_name(std::string_view typed, std::span<const std::string> names) {
    return near_name(typed, std::vector<std::string_view>{names.begin(), names.end()});
}

std::string name_hint(std::string_view typed, std::span<const std::string_view> names) {
    const std::string nearest = near_name(typed, names);
    if (!nearest.empty())
        return fmt::format("did you mean {}?", nearest);
    return fmt::format("known are: {}", fmt::join(names, ", "));
}

} // namespace tonewalk
