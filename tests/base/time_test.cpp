// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/base/time.hpp"

#include <cstdint>

#include <fmt/format.h>

#include "support/run_command.hpp"

namespace {

using namespace tonewalk;
using namespace std::chrono_literals;

std::int64_t nanoseconds_of(std::string_view text) {
    const auto time = parse_utc(text);
    return time ? time->time_since_epoch().count() : -1;
}

// TIME-1, RFC 3339 sections 5.6 and 5.8 (examples of internet date and time); the counts since 1970
// follow from the calendar.
TEST(ParseUtc, ReadsRfc3339WithZoneOffsetAndFraction) {
    EXPECT_EQ(nanoseconds_of("1985-04-12T23:20:50.52Z"), 482196050'520'000'000);
    EXPECT_EQ(nanoseconds_of("1996-12-19T16:39:57-08:00"), nanoseconds_of("1996-12-20T00:39:57Z"));
    EXPECT_EQ(nanoseconds_of("1937-01-01T12:00:27.87+00:20"),
              nanoseconds_of("1937-01-01T11:40:27.87Z"));
    EXPECT_EQ(nanoseconds_of("1970-01-01T00:00:00Z"), 0);
    EXPECT_EQ(nanoseconds_of("1970-01-01t00:00:00z"), 0);
    EXPECT_EQ(nanoseconds_of("1970-01-01T00:00:00.0000000019Z"), 1);
    // SIG-27: date and time of the official logo recording.
    EXPECT_EQ(nanoseconds_of("2021-06-18T23:17:51.163959Z") % 1'000'000'000, 163'959'000);
}

TEST(ParseUtc, CountsSecond60AsTheNextMinutesFirst) {
    EXPECT_EQ(nanoseconds_of("1990-12-31T23:59:60Z"), nanoseconds_of("1991-01-01T00:00:00Z"));
    EXPECT_EQ(nanoseconds_of("1990-12-31T15:59:60.5-08:00"),
              nanoseconds_of("1991-01-01T00:00:00.5Z"));
}

TEST(ParseUtc, RefusesWhatIsNoSuchTime) {
    for (const char* text :
         {"", "2026-05-04", "2026-05-04T09:30:00", "2026-05-04T09:30Z", "2026-02-29T00:00:00Z",
          "2026-13-01T00:00:00Z", "2026-00-10T00:00:00Z", "2026-05-04T24:00:00Z",
          "2026-05-04T09:60:00Z", "2026-05-04T09:30:61Z", "2026-05-04T09:30:00.Z",
          "2026-05-04T09:30:00Zx", "2026-05-04T09:30:00+1:00", "2026-05-04T09:30:00,5Z",
          "26-05-04T09:30:00Z", "1066-10-14T09:00:00Z", "9999-12-31T00:00:00Z",
          "+026-05-04T09:30:00Z"})
        EXPECT_FALSE(parse_utc(text).has_value()) << text;
}

TEST(FormatUtc, TruncatesToTheDecimalsAskedFor) {
    const utc_time time = *parse_utc("2026-05-04T09:30:00.1239999Z");
    EXPECT_EQ(format_utc(time), "2026-05-04T09:30:00.123Z");
    EXPECT_EQ(format_utc(time, 0), "2026-05-04T09:30:00Z");
    EXPECT_EQ(format_utc(time, 9), "2026-05-04T09:30:00.123999900Z");
    EXPECT_EQ(format_utc(*parse_utc("1969-12-31T23:59:59.999Z"), 2), "1969-12-31T23:59:59.99Z");
}

TEST(MovedBy, RoundsToTheNanosecondFarFromTheStart) {
    const utc_time start = *parse_utc("2026-05-04T09:30:00Z");
    EXPECT_EQ(moved_by(start, 0.1) - start, 100ms);
    EXPECT_EQ(moved_by(start, -0.25) - start, -250ms);
    EXPECT_EQ(moved_by(start, 86400.000000001) - start, 86400s + 1ns);
    EXPECT_EQ(moved_by(start, 1e300), utc_time::max());
}

// Outside truth: GNU date, which knows the calendar on its own.
TEST(OutsideUtc, AgreesWithTheSystemsCalendar) {
    for (const char* text :
         {"1999-12-31T23:59:59Z", "2000-02-29T12:00:00Z", "2016-12-31T23:59:59+05:30",
          "1900-03-01T00:00:00Z", "2100-03-01T00:00:00-11:00", "2261-12-30T00:00:01Z"}) {
        const auto outside = test::run_command(fmt::format("date -u -d {} +%s", text));
        ASSERT_EQ(outside.status, 0) << outside.output;
        EXPECT_EQ(nanoseconds_of(text) / 1'000'000'000, std::stoll(outside.output)) << text;
    }
}

} // namespace
