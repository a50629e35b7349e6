// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/base/quantity.hpp"

#include <algorithm>
#include <array>
#include <charconv>
#include <cmath>
#include <string>
#include <utility>

#include <fmt/format.h>

#include "tonewalk/base/error.hpp"
#include "tonewalk/base/text.hpp"

namespace tonewalk {
namespace {

/// "145.2M Hz" as number text "145.2" and unit "M Hz".
struct measure {
    std::string_view number, unit;
};

measure split(std::string_view text) {
    text = trimmed(text);
    const char* const start = text.data();
    const char* const end = start + text.size();
    const bool has_plus = text.starts_with('+') && !text.starts_with("+-");
    double ignored = 0.0;
    const auto [stop, failure] = std::from_chars(start + (has_plus ? 1 : 0), end, ignored);
    const auto length = static_cast<std::size_t>(stop - start);
    return {text.substr(0, length), trimmed(text.substr(length))};
}

/// The number times 10^power, rounded once: "145.2" and 6 give 145200000 exactly.
std::optional<double> scaled(std::string_view number, int power) {
    std::string text{number};
    if (const std::size_t e = text.find_first_of("eE"); e != text.npos) {
        int own = 0;
        const char* const digits = text.data() + e + (text[e + 1] == '+' ? 2 : 1);
        if (std::from_chars(digits, text.data() + text.size(), own).ec != std::errc{} ||
            std::abs(own) > 400)
            return std::nullopt;
        power += own;
        text.resize(e);
    }
    if (!parse_plain_number(text)) // "inf", "nan", "" and the like
        return std::nullopt;
    return parse_plain_number(fmt::format("{}e{}", text, power));
}

struct unit_power {
    std::string_view unit;
    int power;
};

template <std::size_t N>
std::optional<double> in_units(const measure& typed, const std::array<unit_power, N>& units) {
    for (const unit_power& each : units)
        if (each.unit == typed.unit)
            return scaled(typed.number, each.power);
    return std::nullopt;
}

[[noreturn]] void refuse(std::string_view text, std::string_view option, std::string_view wanted,
                         std::string_view example) {
    const bool comma = text.find(',') != text.npos;
    throw error{fault::bad_request, fmt::format("{} is not {}", in_quotes(text), wanted), option,
                fmt::format("{}type it like {}", comma ? "use a decimal point, " : "", example)};
}

constexpr auto frequency_units = std::to_array<unit_power>({
    {"", 0},
    {"K", 3},
    {"k", 3}, // the later one is what we write
    {"M", 6},
    {"G", 9},
});

/// "k Hz", "MHz", "hz" without the hertz.
std::string_view without_hertz(std::string_view unit) {
    if (unit.size() >= 2 && lower_case(unit.substr(unit.size() - 2)) == "hz")
        unit.remove_suffix(2);
    return trimmed(unit);
}

constexpr auto time_units = std::to_array<unit_power>({
    {"", 0},
    {"s", 0},
    {"ms", -3},
    {"us", -6},
});

/// "01:02:03.5" or "02:03" in seconds; every part but the last whole, every part but the first
/// below 60.
std::optional<double> clock_seconds(std::string_view text) {
    double total = 0.0;
    for (int parts = 1;; ++parts) {
        const std::size_t colon = text.find(':');
        const bool last = colon == text.npos;
        const std::string_view part = text.substr(0, colon);
        const auto allowed = last ? std::string_view{"0123456789."} : "0123456789";
        const auto value = parse_plain_number(part);
        if (!value || part.find_first_not_of(allowed) != part.npos ||
            (parts > 1 && *value >= 60.0) || parts > 3)
            return std::nullopt;
        total = total * 60.0 + *value;
        if (last)
            return total;
        text.remove_prefix(colon + 1);
    }
}

std::optional<double> seconds_of(std::string_view text) {
    text = trimmed(text);
    if (text.find(':') != text.npos)
        return clock_seconds(text);
    const measure typed = split(text);
    const double factor = typed.unit == "min" ? 60.0 : typed.unit == "h" ? 3600.0 : 0.0;
    if (factor == 0.0)
        return in_units(typed, time_units);
    const auto number = scaled(typed.number, 0);
    return number ? std::optional{*number * factor} : std::nullopt;
}

[[noreturn]] void refuse_seconds(std::string_view text, std::string_view option,
                                 std::string_view wanted, std::string_view example) {
    if (split(text).unit == "m")
        throw error{fault::bad_request,
                    fmt::format("{} could mean metres or minutes", in_quotes(text)), option,
                    "type min for minutes, s for seconds"};
    refuse(text, option, wanted, example);
}

bool looks_like_a_date(std::string_view text) {
    constexpr std::string_view digits = "0123456789";
    return text.size() > 4 && text.substr(0, 4).find_first_not_of(digits) == text.npos &&
           text[4] == '-';
}

struct engineering {
    double scale;
    std::string_view prefix;
};
constexpr auto prefixes =
    std::to_array<engineering>({{1e9, "G"}, {1e6, "M"}, {1e3, "k"}, {1.0, ""}});

} // namespace

double parse_hz(std::string_view text, std::string_view option) {
    return parse_signed_hz(text, option).hz;
}

signed_hz parse_signed_hz(std::string_view text, std::string_view option) {
    measure typed = split(text);
    typed.unit = without_hertz(typed.unit);
    const auto hz = in_units(typed, frequency_units);
    if (!hz)
        refuse(text, option, "a frequency", "1000, 12.5k or 145.2M");
    return {*hz, typed.number.starts_with('+') || typed.number.starts_with('-')};
}

double parse_seconds(std::string_view text, std::string_view option) {
    const auto seconds = seconds_of(text);
    if (!seconds)
        refuse_seconds(text, option, "a time", "1.5, 200ms, 3min or 01:02:03.5");
    return *seconds;
}

moment parse_moment(std::string_view text, std::string_view option) {
    constexpr std::string_view example = "12.5, 3min, 01:02:03.5 or 2026-05-04T09:30:00Z";
    if (looks_like_a_date(trimmed(text))) {
        const auto time = parse_utc(trimmed(text));
        if (!time)
            refuse(text, option, "a date and time with its zone", example);
        return *time;
    }
    const auto seconds = seconds_of(text);
    if (!seconds)
        refuse_seconds(text, option, "a moment", example);
    return *seconds;
}

double parse_db(std::string_view text, std::string_view option) {
    const measure typed = split(text);
    const auto value = scaled(typed.number, 0);
    if (!value || !(typed.unit.empty() || lower_case(typed.unit) == "db"))
        refuse(text, option, "a number of decibels", "-3 or 6dB");
    return *value;
}

long parse_whole(std::string_view text, std::string_view option, long lowest, long highest) {
    std::string_view digits = trimmed(text);
    if (digits.starts_with('+') && !digits.starts_with("+-"))
        digits.remove_prefix(1);
    long value = 0;
    const char* const end = digits.data() + digits.size();
    const auto [stop, failure] = std::from_chars(digits.data(), end, value);
    if (failure == std::errc::result_out_of_range ||
        (failure == std::errc{} && stop == end && (value < lowest || value > highest)))
        throw error{fault::bad_request, fmt::format("{} is out of range", in_quotes(text)), option,
                    fmt::format("type a whole number from {} to {}", lowest, highest)};
    if (failure != std::errc{} || stop != end)
        refuse(text, option, "a whole number", fmt::format("{}", lowest));
    return value;
}

std::string format_hz(double hz, int digits) {
    if (!std::isfinite(hz))
        return "unknown";
    // Three digits at least, so that 145 never becomes 1.5e+02; rounded first, so that 999.9999
    // becomes 1 k.
    digits = std::clamp(digits, 3, 17);
    const double rounded = parse_plain_number(fmt::format("{:.{}e}", hz, digits - 1)).value_or(hz);
    const auto prefix =
        std::find_if(prefixes.begin(), prefixes.end() - 1,
                     [&](const engineering& each) { return std::abs(rounded) >= each.scale; });
    return fmt::format("{:.{}g} {}Hz", rounded / prefix->scale, digits, prefix->prefix);
}

std::string format_option_hz(double hz, bool as_offset) {
    std::string shortest = fmt::format("{}", hz);
    for (const auto& [unit, power] : frequency_units) {
        const std::string number = fmt::format("{}", hz / std::pow(10.0, power));
        if (number.size() + unit.size() <= shortest.size() && scaled(number, power) == hz)
            shortest = fmt::format("{}{}", number, unit);
    }
    return as_offset && !std::signbit(hz) ? '+' + shortest : shortest;
}

std::string format_option_seconds(double seconds) {
    return std::abs(seconds) < 1.0 ? fmt::format("{:.12g}ms", seconds * 1e3)
                                   : fmt::format("{}s", seconds);
}

} // namespace tonewalk
