// SPDX-License-Identifier: GPL-3.0-or-later
#include "text_value.hpp"

#include <algorithm>
#include <array>
#include <charconv>
#include <cmath>

#include <fmt/format.h>

#include "tonewalk/base/quantity.hpp"
#include "tonewalk/base/text.hpp"

namespace tonewalk {
namespace {

/// Longer ones first, so that "_dbfs_hz" is not taken for "_hz".
constexpr auto unit_endings = std::to_array<std::string_view>(
    {"_dbfs_hz", "_dbw_m2", "_dbuv_m", "_percent", "_dbfs", "_dbhz", "_dbuv", "_dbm", "_dbc",
     "_rad", "_deg", "_db", "_hz", "_m", "_s"});

constexpr std::string_view u95_ending = "_u95", low_ending = "_low95", high_ending = "_high95",
                           random_ending = "_random_u95";

/// Decimals that show two significant digits of an uncertainty; negative to the left of the point.
int decimals_for(double u95) {
    const std::string shown = fmt::format("{:.1e}", u95); // rounded first: 0.0996 is 0.10
    int exponent = 0;
    const char* const digits = shown.data() + shown.find('e') + 1;
    std::from_chars(digits + (*digits == '+' ? 1 : 0), shown.data() + shown.size(), exponent);
    return 1 - exponent;
}

/// A number to so many decimals, without the sign of a negative zero.
std::string fixed(double value, int decimals) {
    if (decimals < 0) {
        const double unit = std::pow(10.0, -decimals);
        value = std::round(value / unit) * unit;
    }
    std::string text = fmt::format("{:.{}f}", value, std::clamp(decimals, 0, 17));
    const bool zero = text.find_first_not_of("-0.") == text.npos;
    return zero && text.front() == '-' ? text.substr(1) : text;
}

std::string with_unit(std::string text, std::string_view unit) {
    return unit.empty() ? text : fmt::format("{} {}", text, unit);
}

bool is_decibel(std::string_view unit) {
    return lower_case(unit).starts_with("db");
}

/// Nobody reads decibels finer than thousandths.
int decimals_shown(double u95, std::string_view unit) {
    return is_decibel(unit) ? std::min(decimals_for(u95), 3) : decimals_for(u95);
}

std::string plus_minus(double value, double u95, std::string_view unit) {
    const int decimals = decimals_shown(u95, unit);
    const double last_digit = std::pow(10.0, -decimals);
    return with_unit(fmt::format("{} +/- {}", fixed(value, decimals),
                                 fixed(std::max(u95, last_digit), decimals)),
                     unit);
}

std::string number_text(const figure& shown, double value) {
    constexpr double hardly_skewed = 0.1; // of the half-width
    if (shown.u95 > 0.0 && std::isfinite(shown.u95))
        return plus_minus(value, shown.u95, shown.unit);
    const double half_width = 0.5 * (shown.high95 - shown.low95);
    if (!(half_width > 0.0 && std::isfinite(half_width)))
        return plain_number(value, shown.unit);
    const double middle = 0.5 * (shown.high95 + shown.low95);
    if (std::abs(value - middle) < hardly_skewed * half_width)
        return plus_minus(value, half_width, shown.unit);
    const int decimals = decimals_shown(half_width, shown.unit);
    return with_unit(fmt::format("{} ({} to {})", fixed(value, decimals),
                                 fixed(shown.low95, decimals), fixed(shown.high95, decimals)),
                     shown.unit);
}

std::string missing_text(const figure& shown) {
    if (std::isfinite(shown.high95))
        return "below " + plain_number(shown.high95, shown.unit);
    return shown.unit.empty() ? "-" : "not measured";
}

struct cell_text {
    const figure& shown;
    std::string operator()(std::monostate) const { return missing_text(shown); }
    std::string operator()(bool yes) const { return yes ? "yes" : "no"; }
    std::string operator()(std::int64_t count) const {
        return with_unit(fmt::format("{}", count), shown.unit);
    }
    std::string operator()(double value) const {
        return std::isfinite(value) ? number_text(shown, value) : missing_text(shown);
    }
    std::string operator()(const std::string& words) const { return words; }
};

} // namespace

std::string label_of(std::string_view key) {
    for (const std::string_view ending : unit_endings)
        if (key.size() > ending.size() && key.ends_with(ending)) {
            key.remove_suffix(ending.size());
            break;
        }
    std::string label{key};
    std::replace(label.begin(), label.end(), '_', ' ');
    return label;
}

std::vector<value_group> group_by_value(const std::vector<std::string_view>& keys) {
    const auto place_of = [&](std::string_view key,
                              std::string_view ending) -> std::optional<std::size_t> {
        const auto found = std::find(keys.begin(), keys.end(), std::string{key}.append(ending));
        return found == keys.end() ? std::nullopt
                                   : std::optional{static_cast<std::size_t>(found - keys.begin())};
    };
    const auto belongs_to_another = [&](std::string_view key) {
        constexpr std::array endings{random_ending, u95_ending, low_ending, high_ending};
        return std::any_of(endings.begin(), endings.end(), [&](std::string_view ending) {
            return key.ends_with(ending) && place_of(key.substr(0, key.size() - ending.size()), "");
        });
    };
    std::vector<value_group> groups;
    for (std::size_t i = 0; i < keys.size(); ++i)
        if (!belongs_to_another(keys[i]))
            groups.push_back({i, place_of(keys[i], u95_ending), place_of(keys[i], low_ending),
                              place_of(keys[i], high_ending)});
    return groups;
}

std::string text_of(const figure& shown) {
    return std::visit(cell_text{shown}, shown.value);
}

std::string plain_number(double value, std::string_view unit) {
    if (unit == "Hz") // carriers to the hertz, tones and widths to hundredths
        return format_hz(value, std::abs(value) < 1e6 ? 7 : 10);
    if (is_decibel(unit))
        return with_unit(fixed(value, 2), unit);
    return with_unit(fmt::format("{:.{}g}", value == 0.0 ? 0.0 : value, unit == "%" ? 4 : 6), unit);
}

std::string time_text(double seconds) {
    if (std::abs(seconds) < 120.0)
        return fmt::format("{:.3g} s", seconds == 0.0 ? 0.0 : seconds);
    const long whole = std::lround(seconds);
    if (whole < 3600)
        return fmt::format("{:02}:{:02}", whole / 60, whole % 60);
    return fmt::format("{}:{:02}:{:02}", whole / 3600, whole / 60 % 60, whole % 60);
}

double number_in(const cell& held) noexcept {
    if (const auto* number = std::get_if<double>(&held))
        return *number;
    if (const auto* whole = std::get_if<std::int64_t>(&held))
        return static_cast<double>(*whole);
    return not_measured;
}

} // namespace tonewalk
