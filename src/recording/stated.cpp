// SPDX-License-Identifier: GPL-3.0-or-later
// What the options change in what a recording says of itself.
#include "stated.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

#include <fmt/format.h>
#include <fmt/ranges.h>

#include "tonewalk/base/error.hpp"
#include "tonewalk/base/quantity.hpp"

namespace tonewalk {
namespace {

void apply_lane(const recording_request& request, stream_facts& facts) {
    facts.lane = request.lane.value_or(0);
    if (facts.lane >= facts.lanes)
        throw error{fault::malformed,
                    fmt::format("has {} lane{}, there is no lane {}", facts.lanes,
                                facts.lanes == 1 ? "" : "s", facts.lane),
                    facts.where(),
                    facts.lanes == 1 ? std::string{"leave --lane out"}
                                     : fmt::format("give --lane 0 to {}", facts.lanes - 1)};
}

void apply_start(const recording_request& request, stated_facts& stated, stream_facts& facts) {
    if (!request.start_utc)
        return;
    if (facts.start_utc && *facts.start_utc != *request.start_utc)
        stated.overridden.push_back(fmt::format("start {}, --start-utc {}",
                                                format_utc(*facts.start_utc),
                                                format_utc(*request.start_utc)));
    facts.start_utc = request.start_utc;
}

void apply_centre(const recording_request& request, stated_facts& stated, stream_facts& facts) {
    if (!request.centre_hz)
        return;
    const auto differs = [&](const stretch_facts& stretch) {
        return stretch.centre_hz && *stretch.centre_hz != *request.centre_hz;
    };
    const auto other = std::find_if(facts.stretches.begin(), facts.stretches.end(), differs);
    if (other != facts.stretches.end())
        stated.overridden.push_back(fmt::format(
            "centre {}, --centre {}", format_hz(*other->centre_hz), format_hz(*request.centre_hz)));
    for (auto& stretch : facts.stretches)
        stretch.centre_hz = request.centre_hz;
}

sample_index position_of(const moment& when, const stream_facts& facts, const char* option) {
    const double position = seconds_into(facts, when, option) * facts.sample_rate_hz;
    constexpr double beyond_all = 9e15;
    return std::llround(std::min(position, beyond_all));
}

sample_index end_of(const stretch_facts& stretch) {
    constexpr sample_index endless = std::numeric_limits<sample_index>::max();
    return stretch.count ? stretch.position + *stretch.count : endless;
}

// The stretch's part at positions [from, until); nothing when it has none.
std::optional<stretch_facts> cut(const stretch_facts& whole, sample_index from,
                                 sample_index until) {
    const sample_index begin = std::max(whole.position, from);
    const sample_index end = std::min(end_of(whole), until);
    if (begin >= end)
        return std::nullopt;
    stretch_facts part = whole;
    part.first += begin - whole.position;
    part.position = begin;
    if (whole.count || until != std::numeric_limits<sample_index>::max())
        part.count = end - begin;
    return part;
}

[[noreturn]] void throw_nothing_left(const stream_facts& facts, sample_index from) {
    const sample_index end = end_of(facts.stretches.back());
    const double rate = facts.sample_rate_hz;
    if (from >= end)
        throw error{fault::malformed,
                    fmt::format("--from {:g} s lies past the end at {:g} s",
                                static_cast<double>(from) / rate, static_cast<double>(end) / rate),
                    facts.where(), "give an earlier --from"};
    throw error{fault::malformed, "holds no samples between --from and --until", facts.where(),
                "widen them: that time lies in a gap"};
}

std::vector<std::size_t> apply_cut(const recording_request& request, stream_facts& facts) {
    const sample_index from = request.from ? position_of(*request.from, facts, "--from") : 0;
    const sample_index until = request.until ? position_of(*request.until, facts, "--until")
                                             : std::numeric_limits<sample_index>::max();
    if (until <= from)
        throw error{fault::bad_request, "--until does not lie after --from", facts.where(),
                    "exchange them, or leave one out"};
    std::vector<stretch_facts> kept;
    std::vector<std::size_t> origins;
    for (std::size_t k = 0; k < facts.stretches.size(); ++k)
        if (const auto part = cut(facts.stretches[k], from, until)) {
            kept.push_back(*part);
            origins.push_back(k);
        }
    if (kept.empty())
        throw_nothing_left(facts, from);
    facts.stretches = std::move(kept);
    return origins;
}

void note_overridden(note_set& notes, const std::vector<std::string>& overridden) {
    if (overridden.empty())
        return;
    notes.add({note_code::metadata_overridden, severity::info,
               fmt::format("the recording itself says: {}", fmt::join(overridden, "; ")),
               "leave the options out to use what the recording says"});
}

} // namespace

double seconds_into(const stream_facts& facts, const moment& when, std::string_view option) {
    double seconds = 0.0;
    if (const auto* const offset_s = std::get_if<double>(&when)) {
        seconds = *offset_s;
    } else if (facts.start_utc) {
        seconds =
            std::chrono::duration<double>(std::get<utc_time>(when) - *facts.start_utc).count();
    } else {
        throw error{fault::bad_request,
                    fmt::format("{} is a time of day, and the recording "
                                "does not say when it starts",
                                option),
                    facts.where(), "give --start-utc, or seconds from the first sample"};
    }
    if (!(seconds >= 0.0))
        throw error{std::holds_alternative<double>(when) ? fault::bad_request : fault::malformed,
                    fmt::format("{} lies before the recording's first sample", option),
                    facts.where(), "give a later time"};
    return seconds;
}

void note_odd_tail(note_set& notes, std::int64_t bytes, std::size_t frame_bytes) {
    if (bytes == 0)
        return;
    notes.add({note_code::odd_tail, severity::warning,
               fmt::format("the last {} of {} bytes of a sample are left out", bytes, frame_bytes),
               "check the format and that the recording was copied whole"});
}

void note_missing_samples(stream_facts& facts) {
    sample_index missing = 0;
    std::size_t gaps = 0;
    for (std::size_t k = 1; k < facts.stretches.size(); ++k) {
        const stretch_facts& before = facts.stretches[k - 1];
        const sample_index gap =
            facts.stretches[k].position - before.position - before.count.value_or(0);
        missing += gap;
        gaps += gap > 0 ? 1U : 0U;
    }
    if (gaps == 0)
        return;
    facts.notes.add({note_code::samples_missing, severity::warning,
                     fmt::format("{} samples ({:.3g} s) are missing in {} {}", missing,
                                 static_cast<double>(missing) / facts.sample_rate_hz, gaps,
                                 gaps == 1 ? "gap" : "gaps"),
                     "no record spans a gap; record to a faster disk, or at a lower rate"});
}

double rate_to_use(const recording_request& request, std::optional<double> stated_hz,
                   const std::string& name) {
    if (!request.rate_hz && !stated_hz)
        throw error{fault::bad_request, "does not say its sample rate", name,
                    "give --rate, such as --rate 2.4M"};
    const double rate_hz = request.rate_hz.value_or(stated_hz.value_or(0.0));
    if (!(rate_hz > 0.0 && rate_hz <= 1e12))
        throw error{fault::bad_request, "--rate must be above 0 and at most 1e12 Hz", name,
                    "give it in Hz, such as --rate 2.4M"};
    return rate_hz;
}

std::vector<std::size_t> apply(const recording_request& request, stated_facts stated,
                               stream_facts& facts) {
    if (facts.stretches.empty())
        throw error{fault::malformed, "holds no samples", facts.where(),
                    "check that it was written and copied whole"};
    facts.swap_iq = request.swap_iq;
    facts.inverted = request.inverted;
    if (stated.rate_hz && *stated.rate_hz != facts.sample_rate_hz)
        stated.overridden.push_back(
            fmt::format("{} samples/s, --rate {}", *stated.rate_hz, facts.sample_rate_hz));
    apply_lane(request, facts);
    apply_start(request, stated, facts);
    apply_centre(request, stated, facts);
    note_overridden(facts.notes, stated.overridden);
    auto origins = apply_cut(request, facts);
    facts.centre_hz = facts.stretches.front().centre_hz;
    return origins;
}

} // namespace tonewalk
