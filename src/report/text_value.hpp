// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "tonewalk/base/sheet.hpp"

namespace tonewalk {

/// "max_dbfs" to "max", "carrier_offset_hz" to "carrier offset": the unit is said elsewhere.
[[nodiscard]] std::string label_of(std::string_view key);

/// Which of some keys belong together: a value and the ends or half-width of its interval.
struct value_group {
    std::size_t value = 0;
    std::optional<std::size_t> u95, low95, high95;
};
/// In the order of the values; "_random_u95" is left to the machine-readable outputs.
[[nodiscard]] std::vector<value_group> group_by_value(const std::vector<std::string_view>& keys);

/// One figure with what is known of its interval (NaN: not known).
struct figure {
    cell value;
    double u95 = not_measured, low95 = not_measured, high95 = not_measured;
    std::string_view unit; ///< also tells how finely people read it
};
/// For people: two digits of the uncertainty, the value to the same place. "-23.41 +/- 0.03 dBFS",
/// "-23.4 (-25.1 to -22.0) dBFS", "below -80.2 dBFS", "not measured".
[[nodiscard]] std::string text_of(const figure&);

/// A plain number as people want it: two decimals of dB, engineering prefixes for Hz, else six
/// digits.
[[nodiscard]] std::string plain_number(double value, std::string_view unit);

/// "12.5 s", "02:03", "1:02:03".
[[nodiscard]] std::string time_text(double seconds);

/// A number cell as double, NaN for anything else.
[[nodiscard]] double number_in(const cell&) noexcept;

} // namespace tonewalk
