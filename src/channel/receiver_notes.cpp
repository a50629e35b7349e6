// SPDX-License-Identifier: GPL-3.0-or-later
#include "receiver_notes.hpp"

#include <cmath>

#include <fmt/core.h>

#include "dc_line.hpp"
#include "image_fit.hpp"

namespace tonewalk {
namespace {

constexpr double noticed_dbc = -60.0; // DC or image in the channel
// Noise alone exceeds it once in a thousand: |k|^2 > 7 of its variances.
constexpr double significant_u95s = 1.9;

/// The next of 1, 2, 5, 10 ... that is no smaller.
double round_up(double value) {
    const double decade = std::pow(10.0, std::floor(std::log10(value)));
    for (const double step : {1.0, 2.0, 5.0}) {
        if (step * decade >= value) {
            return step * decade;
        }
    }
    return 10.0 * decade;
}

/// Where to put the carrier next time so that neither line meets its channel.
std::string retuning_advice(const found_signal& f, const stream_facts& facts) {
    constexpr double clear_of_widths = 1.5;
    const double away_hz = round_up(clear_of_widths * f.width_hz);
    const double rate_hz = 2.0 * (away_hz + f.width_hz);
    const std::string record = rate_hz > facts.sample_rate_hz
                                   ? fmt::format("record {} or more of bandwidth next time, and "
                                                 "tune the receiver",
                                                 format_hz(round_up(rate_hz)))
                                   : std::string{"next time tune the receiver"};
    if (!facts.centre_hz) {
        return fmt::format("{} so that the carrier lies at +{} or more", record,
                           format_hz(away_hz));
    }
    const double grid_hz = round_up(away_hz / 10.0);
    const double highest_hz = *facts.centre_hz + f.offset_hz - away_hz;
    return fmt::format("{} to {} so that the carrier lies at +{} or more", record,
                       format_hz(std::floor(highest_hz / grid_hz) * grid_hz), format_hz(away_hz));
}

void note_line(found_signal& f, note_code code, std::string_view what, double ratio,
               const std::string& advice) {
    const double dbc = decibel::from_amplitude_ratio(ratio).db();
    if (dbc > noticed_dbc) {
        f.notes.add(
            {code, severity::warning,
             fmt::format("{} lies in the channel, {:.1f} dB against the carrier", what, dbc),
             advice});
    }
}

} // namespace

void note_receiver(found_signal& f, double offset_hz, const found_carrier& chosen,
                   const searched& s) {
    const stream_facts& facts = *s.look.what.facts;
    const double from_centre_hz = std::abs(offset_hz);
    f.image_ratio = facts.format.is_complex ? 0.0 : 1.0;
    if (!facts.format.is_complex || from_centre_hz >= f.width_hz) {
        return;
    }
    const std::string advice = retuning_advice(f, facts);
    const double carrier = decibel::from_db(chosen.level_dbfs).amplitude_ratio();
    f.dc_amplitude = dc_line(s.look.what, s.spectrum, offset_hz);
    note_line(f, note_code::dc_in_channel, "the receiver's DC line", f.dc_amplitude / carrier,
              advice);
    image_fit images;
    images.add(s.look.what, s.spectrum);
    if (const auto balance = images.result()) {
        const double ratio = std::abs(balance->image_ratio);
        f.image_ratio = balance->image_bound();
        if (2.0 * from_centre_hz < f.width_hz &&
            ratio > significant_u95s * balance->image_ratio_u95) {
            note_line(f, note_code::image_in_channel, "the carrier's own image", ratio,
                      advice + "; measuring with --mend-iq removes what stands there now");
        }
    }
}

} // namespace tonewalk
