// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/channel/signal_search.hpp"

#include <algorithm>
#include <cmath>

#include <fmt/core.h>
#include <fmt/ranges.h>

#include "close_look.hpp"
#include "line_spectrum.hpp"
#include "search_opening.hpp"
#include "search_survey.hpp"
#include "tonewalk/base/decibel.hpp"
#include "tonewalk/base/error.hpp"

namespace tonewalk {
namespace {

constexpr double short_opening_s = 1.0;
constexpr std::size_t least_probe = 256;
constexpr double rival_db = 20.0;
constexpr double least_width_hz = 2000.0, width_without_tone_hz = 20e3, harmonics_held = 3.0;
constexpr double widest_start_hz = 500.0; // how far a given carrier may be off
constexpr double noticed_dbc = -60.0;     // DC or image in the channel

const found_carrier& choose(const std::vector<found_carrier>& carriers) {
    const auto with_tone = std::find_if(carriers.begin(), carriers.end(),
                                        [](const found_carrier& c) { return !c.tones.empty(); });
    return with_tone != carriers.end() ? *with_tone : carriers.front();
}

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

/// The widest channel about the carrier that the band holds.
double widest(double offset_hz, const stream_facts& facts) {
    const double above = half_band(facts) - std::abs(offset_hz);
    return 2.0 * (facts.format.is_complex ? above : std::min(above, offset_hz));
}

void choose_width(found_signal& f, const search_request& request, const stream_facts& facts) {
    const double room_hz = widest(f.offset_hz, facts);
    if (request.width_hz) {
        if (*request.width_hz > room_hz) {
            throw error{fault::malformed,
                        fmt::format("does not fit: the band holds {} about the carrier",
                                    format_hz(room_hz, 6)),
                        fmt::format("--width {}", format_option_hz(*request.width_hz, false)),
                        "give a smaller one"};
        }
        f.width_hz = *request.width_hz;
        if (request.tone_hz && *request.tone_hz > f.width_hz / 2.0) {
            throw error{fault::malformed,
                        fmt::format("does not hold the tone of {}", format_hz(*request.tone_hz, 6)),
                        fmt::format("--width {}", format_option_hz(*request.width_hz, false)),
                        fmt::format("give {} or more",
                                    format_option_hz(std::ceil(2.2 * *request.tone_hz), false))};
        }
        if (f.tone_hz && *f.tone_hz > f.width_hz / 2.0) {
            f.notes.add({note_code::no_tone, severity::warning,
                         fmt::format("the tone of {} lies outside the width that was given",
                                     format_hz(*f.tone_hz, 6)),
                         "levels are the carrier's; give a larger --width for the tone's"});
            f.tone_hz.reset();
        }
        return;
    }
    const double wanted_hz = f.tone_hz ? std::max(least_width_hz, 2.0 * harmonics_held * *f.tone_hz)
                                       : width_without_tone_hz;
    f.width_hz = std::min(wanted_hz, room_hz);
    const double least_hz = f.tone_hz ? 2.0 * *f.tone_hz : 0.0;
    if (f.width_hz <= least_hz || f.width_hz <= 0.0) {
        throw error{fault::malformed,
                    fmt::format("the band ends {} off the carrier, before the tone",
                                format_hz(room_hz / 2.0, 6)),
                    facts.name, "record with the carrier further from the band's edge"};
    }
    if (f.width_hz < wanted_hz) {
        f.notes.add({note_code::channel_narrowed, severity::info,
                     fmt::format("the channel is {} wide instead of {}: the band ends there",
                                 format_hz(f.width_hz, 6), format_hz(wanted_hz, 6)),
                     "record with the carrier further from the band's edge"});
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
                     fmt::format("for those type {}", fmt::join(rivals, ", "))});
    }
    if (in_channel) {
        f.notes.add({note_code::carrier_in_channel, severity::warning,
                     "another carrier lies in the channel",
                     "give a smaller --width; an envelope shows both"});
    }
}

/// Amplitude of the receiver's own line at `hz`, as far as it stands out; else 0.
double own_line(const line_spectrum& survey, double hz) {
    const double reach_hz = 1.5 * survey.bin_hz();
    const auto bin = survey.strongest(hz - reach_hz, hz + reach_hz);
    return bin ? std::sqrt(survey.peak_at(*bin).power) : 0.0;
}

/// The receiver's DC line and the carrier's own image, where they stand near the channel and apart
/// from the carrier.
void note_receiver(found_signal& f, const found_carrier& chosen, const line_spectrum& survey,
                   const stream_facts& facts) {
    const double from_centre_hz = std::abs(f.offset_hz);
    f.image_ratio = facts.format.is_complex ? 0.0 : 1.0;
    if (!facts.format.is_complex || from_centre_hz >= f.width_hz ||
        from_centre_hz <= 2.0 * centre_bins * survey.bin_hz()) {
        return;
    }
    const double carrier = decibel::from_db(chosen.level_dbfs).amplitude_ratio();
    f.dc_amplitude = own_line(survey, 0.0);
    f.image_ratio = own_line(survey, -f.offset_hz) / carrier;
    const auto add_above_limit = [&](note_code code, double ratio, std::string_view what) {
        const double dbc = decibel::from_amplitude_ratio(ratio).db();
        if (dbc > noticed_dbc) {
            f.notes.add(
                {code, severity::warning,
                 fmt::format("{} lies in the channel, {:.1f} dB against the carrier", what, dbc),
                 fmt::format("tune the receiver {} or more away from the carrier next time",
                             format_hz(2.0 * f.width_hz, 3))});
        }
    };
    add_above_limit(note_code::dc_in_channel, f.dc_amplitude / carrier, "the receiver's DC line");
    if (2.0 * from_centre_hz < f.width_hz) {
        add_above_limit(note_code::image_in_channel, f.image_ratio, "the carrier's own image");
    }
}

curve spectrum_curve(const line_spectrum& spectrum, bool is_complex) {
    constexpr std::size_t most_points = 1024;
    curve c;
    c.name = "spectrum";
    c.kind = "line";
    c.x_unit = "Hz";
    c.y_unit = "dBFS";
    const std::size_t first = is_complex ? 0 : spectrum.size() / 2;
    const std::size_t run = std::max<std::size_t>(1, (spectrum.size() - first) / most_points);
    for (std::size_t k = first; k < spectrum.size();
         k += run) { // the highest of each run: no line is lost
        std::size_t best = k;
        for (std::size_t m = k; m < std::min(k + run, spectrum.size()); ++m) {
            best = spectrum.power(m) > spectrum.power(best) ? m : best;
        }
        c.x.push_back(spectrum.hz_of(static_cast<double>(best)));
        c.y.push_back(decibel::from_power_ratio(std::max(spectrum.power(best), 1e-30)).db());
    }
    return c;
}

/// The carrier that the user names, from the strongest line near it, or the given value itself.
found_carrier take_given(const looked_at& what, double offset_hz, const search_request& request) {
    const close_look look{what, offset_hz};
    const double reach_hz =
        std::min(request.width_hz.value_or(least_width_hz) / 4.0, widest_start_hz);
    return look.describe(look.strongest(reach_hz).value_or(0.0), request.tone_hz);
}

void take_tone(found_signal& f, const found_carrier& chosen, const search_request& request,
               const looked_at& what) {
    if (request.tone_hz) {
        const found_carrier asked =
            request.carrier ? chosen
                            : close_look{what, chosen.offset_hz}.describe(0.0, request.tone_hz);
        f.tone_hz = asked.tones.empty() ? *request.tone_hz : asked.tones.front().frequency_hz;
        if (std::abs(f.offset_hz) + *f.tone_hz >= half_band(*what.facts)) {
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
                     "levels are the carrier's; give --tone where there is one"});
    } else {
        f.notes.add({note_code::no_tone, severity::warning, "no tone was found on the carrier",
                     "levels are the carrier's; give --tone where there is one"});
    }
}

void note_short_opening(found_signal& f, const looked_at& what) {
    if (what.seconds() < short_opening_s) {
        f.notes.add({note_code::short_opening, severity::info,
                     fmt::format("only {:.2g} s could be searched for the signal", what.seconds()),
                     "give --carrier and --tone where they are known"});
    }
}

/// What was searched, and what its spectrum showed.
struct searched {
    explicit searched(opening o) : look{std::move(o)}, spectrum{survey(look.what)} {}
    opening look;
    line_spectrum spectrum;
};

/// Fills f.carriers from the opening, else from the first probe of a file that holds any.
void find_carriers(found_signal& f, searched& s, block_source& source,
                   const sample_converter& converter) {
    f.carriers = carriers_in(s.look.what, s.spectrum);
    for (std::size_t k = 0; f.carriers.empty() && source.facts().seekable && k < probes; ++k) {
        opening probe = look_at_probe(source, converter, k);
        if (probe.what.frames < least_probe) {
            continue;
        }
        s = searched{std::move(probe)};
        f.carriers = carriers_in(s.look.what, s.spectrum);
        if (!f.carriers.empty()) {
            f.notes.add({note_code::late_carrier, severity::info,
                         "the carrier is not in the opening; it was found further on",
                         "levels before it came on are bounds; --from leaves them out"});
        }
    }
    if (f.carriers.empty()) {
        throw error{fault::malformed, "no carrier stands out of the noise", source.facts().name,
                    "give --carrier, as an offset with a sign or as a frequency"};
    }
}

} // namespace

found_signal find_signal(block_source& source, const search_request& request) {
    const stream_facts& facts = source.facts();
    const sample_converter converter{facts};
    std::optional<double> given_hz;
    if (request.carrier) {
        given_hz = given_offset(*request.carrier, facts);
        check_in_band(*given_hz, facts, *request.carrier);
    }
    opening start = look_at_opening(source, converter);
    if (start.what.frames == 0) {
        throw error{fault::malformed, "holds no samples", facts.name, "give a recording that does"};
    }
    found_signal f;
    note_short_opening(f, start.what);
    searched s{std::move(start)};
    if (given_hz) {
        f.carriers.push_back(take_given(s.look.what, *given_hz, request));
    } else {
        find_carriers(f, s, source, converter);
    }
    const found_carrier chosen = choose(f.carriers);
    f.offset_hz = chosen.offset_hz;
    take_tone(f, chosen, request, s.look.what);
    choose_width(f, request, facts);
    note_rivals(f, chosen);
    note_receiver(f, chosen, s.spectrum, facts);
    const bool offset_given = request.carrier && request.carrier->is_offset;
    f.plan = {.carrier_hz = f.offset_hz, .absolute = false, .width_hz = f.width_hz};
    if (facts.centre_hz && !offset_given) { // followed through segments of other centres
        f.plan.carrier_hz += *facts.centre_hz;
        f.plan.absolute = true;
    }
    f.spectrum = spectrum_curve(s.spectrum, facts.format.is_complex);
    return f;
}

} // namespace tonewalk
