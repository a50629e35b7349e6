// SPDX-License-Identifier: GPL-3.0-or-later
#include "channel_width.hpp"

#include <cmath>

#include <fmt/core.h>

#include "tonewalk/base/error.hpp"

namespace tonewalk {
namespace {

constexpr double width_without_tone_hz = 20e3, harmonics_held = 3.0;

error width_error(double width_hz, const std::string& what, const std::string& mend) {
    return error{fault::malformed, what,
                 fmt::format("--width {}", format_option_hz(width_hz, false)), mend};
}

void take_given_width(found_signal& f, double room_hz, const search_request& request) {
    f.width_hz = *request.width_hz;
    if (f.width_hz > room_hz) {
        throw width_error(
            f.width_hz,
            fmt::format("does not fit: the band holds {} about the carrier", format_hz(room_hz, 6)),
            "give a smaller one");
    }
    if (request.tone_hz && *request.tone_hz > f.width_hz / 2.0) {
        throw width_error(
            f.width_hz, fmt::format("does not hold the tone of {}", format_hz(*request.tone_hz, 6)),
            fmt::format("give {} or more",
                        format_option_hz(std::ceil(2.2 * *request.tone_hz), false)));
    }
    if (f.tone_hz && *f.tone_hz > f.width_hz / 2.0) {
        f.notes.add({note_code::no_tone, severity::warning,
                     fmt::format("the tone of {} lies outside the width that was given",
                                 format_hz(*f.tone_hz, 6)),
                     "levels are the carrier's; give a larger --width for the tone's"});
        f.tone_hz.reset();
    }
}

} // namespace

channel_width automatic_width(double offset_hz, std::optional<double> tone_hz,
                              const stream_facts& facts) noexcept {
    const double above_hz = facts.sample_rate_hz / 2.0 - std::abs(offset_hz);
    const bool is_complex = facts.format.is_complex;
    return {.wanted_hz = tone_hz ? std::max(least_width_hz, 2.0 * harmonics_held * *tone_hz)
                                 : width_without_tone_hz,
            .room_hz = 2.0 * (is_complex ? above_hz : std::min(above_hz, offset_hz)),
            .least_hz = tone_hz ? 2.0 * *tone_hz : 0.0};
}

void choose_width(found_signal& f, double offset_hz, const search_request& request,
                  const stream_facts& facts) {
    const channel_width automatic = automatic_width(offset_hz, f.tone_hz, facts);
    if (request.width_hz) {
        take_given_width(f, automatic.room_hz, request);
        return;
    }
    if (!automatic.fits()) {
        throw error{fault::malformed,
                    fmt::format("the band ends {} off the carrier, before the tone",
                                format_hz(automatic.room_hz / 2.0, 6)),
                    facts.where(), "record with the carrier further from the band's edge"};
    }
    f.width_hz = automatic.hz();
    if (f.width_hz < automatic.wanted_hz) {
        f.notes.add({note_code::channel_narrowed, severity::info,
                     fmt::format("the channel is {} wide instead of {}: the band ends there",
                                 format_hz(f.width_hz, 6), format_hz(automatic.wanted_hz, 6)),
                     "record with the carrier further from the band's edge"});
    }
}

} // namespace tonewalk
