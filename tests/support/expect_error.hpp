// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <optional>
#include <string>

#include "tonewalk/base/error.hpp"

namespace tonewalk::test {

struct caught_error {
    std::optional<fault> kind; ///< empty: nothing was thrown
    int exit_status = 0;
    std::string line;
    [[nodiscard]] bool says(const std::string& part) const { return line.find(part) != line.npos; }
};

/// Runs `action` and keeps the tonewalk::error that it throws.
template <typename Action>
caught_error caught(Action&& action) {
    try {
        action();
    } catch (const error& failure) {
        return {failure.kind(), failure.exit_status(), failure.what()};
    }
    return {};
}

} // namespace tonewalk::test
