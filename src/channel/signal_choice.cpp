// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal_choice.hpp"

#include <algorithm>
#include <cmath>

#include <fmt/core.h>
#include <fmt/ranges.h>

#include "channel_width.hpp"
#include "close_look.hpp"
#include "receiver_notes.hpp"
#include "spectrum_curve.hpp"
#include "tonewalk/base/error.hpp"

namespace tonewalk {
namespace {

constexpr double rival_db = 20.0;
constexpr double widest_start_hz = 500.0; // how far a given carrier may be off

double given_offset(const signed_hz& carrier, const stream_facts& facts) {
    if (carrier.is_offset || !facts.format.is_complex) {
        if (!carrier.is_offset && facts.centre_hz) {
            return carrier.hz - *facts.centre_hz;
        }
        return carrier.hz;
    }
    if (!facts.centre_hz) {
        throw error{fault::bad_request, "needs to know what lies at the recording's centre",
                    fmt::format("--carrier {}", format_option_hz(carrier.hz, false)),
                    "give --centre, or the carrier's offset with a sign"};
    }
    return carrier.hz - *facts.centre_hz;
}

double half_band(const stream_facts& facts) {
    return facts.sample_rate_hz / 2.0;
}

void check_in_band(double offset_hz, const stream_facts& facts, const signed_hz& carrier) {
    const bool inside =
        std::abs(offset_hz) < half_band(facts) && (facts.format.is_complex || offset_hz > 0.0);
    if (!inside) {
        throw error{fault::malformed,
                    fmt::format("lies outside the recording's band of {}",
                                format_hz(facts.format.is_complex ? facts.sample_rate_hz
                                                                  : half_band(facts))),
                    fmt::format("--carrier {}", format_option_hz(carrier.hz, carrier.is_offset)),
                    "give a carrier inside it"};
    }
}

std::string what_to_type(const found_carrier& c) {
    return fmt::format("--carrier {} ({:.1f} dBFS)",
                       format_option_hz(std::round(c.offset_hz), true), c.level_dbfs);
}

void note_rivals(found_signal& f, const found_carrier& chosen) {
    std::vector<std::string> rivals;
    bool in_channel = false;
    for (const found_carrier& c : f.carriers) {
        if (c.offset_hz == chosen.offset_hz) {
            continue;
        }
        in_channel = in_channel || std::abs(c.offset_hz - f.offset_hz) < 0.75 * f.width_hz;
        if (c.level_dbfs > chosen.level_dbfs - rival_db) {
            rivals.push_back(what_to_type(c));
        }
    }
    if (!rivals.empty()) {
        f.notes.add({note_code::several_carriers, severity::warning,
                     fmt::format("{} was taken; others stand there too", what_to_type(chosen)),
                     fmt::format("for those measure with {}", fmt::join(rivals, ", "))});
    }
    if (in_channel) {
        f.notes.add({note_code::carrier_in_channel, severity::warning,
                     "another carrier lies in the channel",
                     "give a smaller --width; an envelope shows both"});
    }
}

/// `offset_hz` from the centre of the stretch that was searched.
void take_tone(found_signal& f, double offset_hz, const found_carrier& chosen,
               const search_request& request, const looked_at& what) {
    if (request.tone_hz) {
        const found_carrier asked =
            request.carrier ? chosen : close_look{what, offset_hz}.describe(0.0, request.tone_hz);
        f.tone_hz = asked.tones.empty() ? *request.tone_hz : asked.tones.front().frequency_hz;
        if (std::abs(offset_hz) + *f.tone_hz >= half_band(*what.facts)) {
            throw error{fault::malformed, "lies outside the recording's band at this carrier",
                        fmt::format("--tone {}", format_option_hz(*request.tone_hz, false)),
                        "give a lower tone"};
        }
        return;
    }
    if (!chosen.tones.empty()) {
        f.tone_hz = chosen.tones.front().frequency_hz;
        return;
    }
    if (chosen.modulated_unsteadily) {
        f.notes.add({note_code::no_steady_tone, severity::warning,
                     "the carrier is modulated, but no tone is steady for 1 s: speech or programme",
                     "levels are the carrier's; measure with --tone where there is one"});
    } else {
        f.notes.add({note_code::no_tone, severity::warning, "no tone was found on the carrier",
                     "levels are the carrier's; measure with --tone where there is one"});
    }
}

} // namespace

note_set notes_on(const looked_at& what) {
    constexpr double short_opening_s = 1.0;
    note_set notes;
    if (what.seconds() < short_opening_s) {
        notes.add({note_code::short_opening, severity::info,
                   fmt::format("only {:.2g} s could be searched for the signal", what.seconds()),
                   "measure with --carrier and --tone where they are known"});
    }
    return notes;
}

std::optional<double> given_carrier(const search_request& request, const stream_facts& facts) {
    if (!request.carrier) {
        return std::nullopt;
    }
    const double offset_hz = given_offset(*request.carrier, facts);
    check_in_band(offset_hz, facts, *request.carrier);
    return offset_hz;
}

found_carrier take_given(const looked_at& what, double offset_hz, const search_request& request) {
    const close_look look{what, offset_hz - what.centre_shift_hz};
    const double reach_hz =
        std::min(request.width_hz.value_or(least_width_hz) / 4.0, widest_start_hz);
    found_carrier found = look.describe(look.strongest(reach_hz).value_or(0.0), request.tone_hz);
    found.offset_hz += what.centre_shift_hz;
    return found;
}

const found_carrier& choose(const std::vector<found_carrier>& carriers) {
    const auto with_tone = std::find_if(carriers.begin(), carriers.end(),
                                        [](const found_carrier& c) { return !c.tones.empty(); });
    return with_tone != carriers.end() ? *with_tone : carriers.front();
}

found_signal take_signal(const searched& s, std::vector<found_carrier> carriers,
                         const found_carrier& chosen, const search_request& request) {
    const looked_at& what = s.look.what;
    const stream_facts& facts = *what.facts;
    const double stretch_offset_hz = chosen.offset_hz - what.centre_shift_hz;
    found_signal f;
    f.offset_hz = chosen.offset_hz;
    take_tone(f, stretch_offset_hz, chosen, request, what);
    choose_width(f, stretch_offset_hz, request, facts);
    f.carriers = std::move(carriers);
    note_rivals(f, chosen);
    note_receiver(f, stretch_offset_hz, chosen, s);
    const bool offset_given = request.carrier && request.carrier->is_offset;
    f.plan = {.carrier_hz = f.offset_hz, .absolute = false, .width_hz = f.width_hz};
    if (facts.centre_hz && !offset_given) { // followed through segments of other centres
        f.plan.carrier_hz += *facts.centre_hz;
        f.plan.absolute = true;
    }
    f.spectrum = spectrum_curve(s.spectrum, facts, what.centre_shift_hz);
    return f;
}

} // namespace tonewalk
