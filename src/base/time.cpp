// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/base/time.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <cstdint>

#include <fmt/format.h>

namespace tonewalk {
namespace {

using namespace std::chrono;

/// Takes a text apart from its front; after a failure everything else fails too.
class reader {
public:
    explicit reader(std::string_view text) : rest_{text} {}

    bool take(std::string_view any_of) {
        const bool fits = ok_ && !rest_.empty() && any_of.find(rest_.front()) != any_of.npos;
        if (fits)
            rest_.remove_prefix(1);
        return fits;
    }
    void need(std::string_view any_of) { ok_ = take(any_of) && ok_; }
    /// Exactly `width` digits, at most `highest`.
    int digits(int width, int highest) {
        int value = 0;
        for (int i = 0; i < width; ++i)
            value = 10 * value + digit();
        ok_ = ok_ && value <= highest;
        return value;
    }
    /// One or more digits after the point, to the nanosecond.
    nanoseconds fraction() {
        nanoseconds value{0};
        std::int64_t unit = 100'000'000;
        do {
            value += nanoseconds{unit * digit()};
            unit /= 10;
        } while (ok_ && next_is_digit());
        return value;
    }
    [[nodiscard]] bool finished() const { return ok_ && rest_.empty(); }
    [[nodiscard]] bool starts_with(std::string_view any_of) const {
        return !rest_.empty() && any_of.find(rest_.front()) != any_of.npos;
    }
    void refuse() { ok_ = false; }

private:
    [[nodiscard]] bool next_is_digit() const { return starts_with("0123456789"); }
    int digit() {
        ok_ = ok_ && next_is_digit();
        if (!ok_)
            return 0;
        const int value = rest_.front() - '0';
        rest_.remove_prefix(1);
        return value;
    }
    std::string_view rest_;
    bool ok_ = true;
};

sys_days read_date(reader& in) {
    const int year_number = in.digits(4, 9999);
    in.need("-");
    const int month_number = in.digits(2, 12);
    in.need("-");
    const int day_number = in.digits(2, 31);
    const year_month_day date{year{year_number}, month{static_cast<unsigned>(month_number)},
                              day{static_cast<unsigned>(day_number)}};
    // What a 64-bit count of nanoseconds can hold, with a day to spare at both ends.
    if (!date.ok() || year_number < 1678 || year_number > 2261) {
        in.refuse();
        return {};
    }
    return sys_days{date};
}

nanoseconds read_clock(reader& in) {
    nanoseconds since_midnight = hours{in.digits(2, 23)};
    in.need(":");
    since_midnight += minutes{in.digits(2, 59)};
    in.need(":");
    since_midnight += seconds{in.digits(2, 60)};
    if (in.take("."))
        since_midnight += in.fraction();
    return since_midnight;
}

minutes read_zone(reader& in) {
    if (in.take("Zz"))
        return minutes{0};
    const int sign = in.starts_with("-") ? -1 : 1;
    in.need("+-");
    const minutes ahead = hours{in.digits(2, 23)};
    in.need(":");
    return sign * (ahead + minutes{in.digits(2, 59)});
}

} // namespace

std::optional<utc_time> parse_utc(std::string_view text) {
    reader in{text};
    const sys_days date = read_date(in);
    in.need("Tt ");
    const nanoseconds clock = read_clock(in);
    const minutes zone = read_zone(in);
    if (!in.finished())
        return std::nullopt;
    return utc_time{date} + clock - zone;
}

std::string format_utc(utc_time time, int decimals) {
    const auto date_part = floor<days>(time);
    const year_month_day date{date_part};
    const hh_mm_ss clock{time - date_part};
    std::string text =
        fmt::format("{:04}-{:02}-{:02}T{:02}:{:02}:{:02}", static_cast<int>(date.year()),
                    static_cast<unsigned>(date.month()), static_cast<unsigned>(date.day()),
                    clock.hours().count(), clock.minutes().count(), clock.seconds().count());
    if (const int shown = std::clamp(decimals, 0, 9); shown > 0)
        text += '.' + fmt::format("{:09}", clock.subseconds().count())
                          .substr(0, static_cast<unsigned>(shown));
    return text + 'Z';
}

utc_time moved_by(utc_time start, double seconds_later) {
    const double target_ns =
        static_cast<double>(start.time_since_epoch().count()) + seconds_later * 1e9;
    constexpr double farthest_ns = 9.2e18;
    if (!(std::abs(target_ns) < farthest_ns))
        return target_ns < 0.0 ? utc_time::min() : utc_time::max();
    // Whole seconds apart from the rest: their product with 1e9 would lose nanoseconds.
    const double whole = std::floor(seconds_later);
    return start + seconds{std::llround(whole)} +
           nanoseconds{std::llround((seconds_later - whole) * 1e9)};
}

} // namespace tonewalk
