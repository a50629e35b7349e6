// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <span>
#include <string_view>

namespace tonewalk {

/// One row of the table of allowed errors, shared by tests and docs: what may differ from the truth
/// by how much, under which conditions.
struct allowed_error {
    std::string_view key;        ///< "level_db.clean"
    std::string_view quantity;   ///< "carrier and tone level"
    std::string_view conditions; ///< "peak 0 to -90 dBFS, cf32, no noise"
    std::string_view unit;
    double allowed;
};
[[nodiscard]] std::span<const allowed_error> allowed_errors() noexcept;
/// The row of that key; asserts that there is one.
[[nodiscard]] double allowed(std::string_view key) noexcept;

} // namespace tonewalk
