// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/channel/signal_search.hpp"

#include <algorithm>
#include <cmath>

#include <fmt/core.h>
#include <fmt/ranges.h>

#include "close_look.hpp"
#include "line_spectrum.hpp"
#include "tonewalk/base/decibel.hpp"
#include "tonewalk/base/error.hpp"

namespace tonewalk {
namespace {

constexpr double opening_s = 2.0;
constexpr std::size_t opening_bytes = std::size_t{32} * 1024 * 1024;
constexpr double short_opening_s = 1.0;
constexpr std::size_t probes = 16;
constexpr double probe_s = 1.0;
constexpr std::size_t most_transform = std::size_t{1} << 19;
constexpr std::size_t least_transform = 256;
constexpr std::size_t most_close_looks = 10;
constexpr double centre_bins = 3.0;
const double line_ratio = decibel::from_db(12.0).power_ratio();
const double image_ratio_limit = decibel::from_db(-20.0).power_ratio();
constexpr double rival_db = 20.0;
constexpr double least_width_hz = 2000.0, width_without_tone_hz = 20e3, harmonics_held = 3.0;
constexpr double widest_start_hz = 500.0; // how far a given carrier may be off
constexpr double noticed_dbc = -60.0;     // DC or image in the channel

struct survey {
    line_spectrum spectrum;
    double second_moment = 0.0; // |mean z^2| / mean |z|^2: twice the image's amplitude ratio
};

std::size_t survey_size(std::size_t frames) {
    std::size_t size = least_transform;
    while (2 * size <= frames / 4 && 2 * size <= most_transform) {
        size *= 2;
    }
    return std::min(size, std::max<std::size_t>(frames, 1));
}

survey make_survey(const looked_at& what) {
    const std::size_t size = survey_size(what.frames), frame_bytes = what.facts->frame_bytes();
    survey s{line_spectrum{size, what.facts->sample_rate_hz}};
    std::vector<cf32> segment(size);
    cf64 squares{};
    double powers = 0.0;
    for (std::size_t first = 0; first + size <= what.frames;
         first += std::max<std::size_t>(1, size / 2)) {
        what.converter->convert(what.bytes.subspan(first * frame_bytes, size * frame_bytes),
                                segment);
        s.spectrum.add(segment);
        for (const cf32 z : segment) {
            squares += cf64{z} * cf64{z};
            powers += static_cast<double>(std::norm(z));
        }
    }
    s.spectrum.finish();
    s.second_moment = powers > 0.0 ? std::abs(squares) / powers : 0.0;
    return s;
}

struct candidate {
    double hz = 0.0, power = 0.0;
    bool at_centre = false;
};

/// Lines 12 dB over the noise, strongest first; not images; those at the centre are marked.
std::vector<candidate> candidates_in(const survey& s, bool is_complex) {
    std::vector<candidate> found;
    const line_spectrum& spectrum = s.spectrum;
    const std::size_t first = is_complex ? 0 : spectrum.bin_of(0.0);
    for (std::size_t k = first; k < spectrum.size(); ++k) {
        if (!spectrum.is_line(k, line_ratio)) {
            continue;
        }
        const double hz = spectrum.peak_hz(k);
        const double mirrored = spectrum.power(spectrum.bin_of(-hz));
        const bool centre = std::abs(hz) <= centre_bins * spectrum.bin_hz();
        if (is_complex && !centre && spectrum.power(k) < image_ratio_limit * mirrored) {
            continue;
        }
        if (is_complex || !centre) {
            found.push_back({centre ? 0.0 : hz, spectrum.power(k), centre});
        }
    }
    std::sort(found.begin(), found.end(),
              [](const candidate& a, const candidate& b) { return a.power > b.power; });
    return found;
}

/// Whether `hz` is one of the lines that the tones of `c` put beside it: n tones away, either side.
bool is_sideband_of(const found_carrier& c, double hz, double tolerance_hz) {
    const double away = std::abs(hz - c.offset_hz);
    for (const found_tone& tone : c.tones) {
        const double order = std::round(away / tone.frequency_hz);
        if (order >= 1.0 && order <= 10.0 &&
            std::abs(away - order * tone.frequency_hz) < tolerance_hz) {
            return true;
        }
    }
    constexpr double speech_reach_hz = 6000.0;
    return c.modulated_unsteadily && away < speech_reach_hz;
}

/// Carriers among the candidates: each is looked at closely, sidebands of those before it drop out.
/// A second round lets a carrier claim lines that were stronger than itself.
std::vector<found_carrier> carriers_in(const looked_at& what, const survey& s) {
    std::vector<found_carrier> carriers;
    const double tolerance_hz = 2.0 * s.spectrum.bin_hz() + 2.0;
    std::size_t looks = 0;
    for (const candidate& c : candidates_in(s, what.facts->format.is_complex)) {
        const bool known =
            std::any_of(carriers.begin(), carriers.end(), [&](const found_carrier& f) {
                return is_sideband_of(f, c.hz, tolerance_hz) ||
                       std::abs(f.offset_hz - c.hz) < tolerance_hz;
            });
        if (known || ++looks > most_close_looks) {
            continue;
        }
        const close_look look{what, c.hz};
        const double reach_hz = (c.at_centre ? centre_bins + 1.0 : 2.0) * s.spectrum.bin_hz() + 1.0;
        const auto hz = look.strongest(reach_hz);
        if (!hz) {
            continue;
        }
        found_carrier found = look.describe(*hz, std::nullopt);
        const bool counts =
            std::abs(found.offset_hz) > centre_bins * s.spectrum.bin_hz() || !found.tones.empty();
        if (counts) {
            carriers.push_back(std::move(found));
        }
    }
    const std::vector<found_carrier> all = carriers;
    carriers.erase(
        std::remove_if(
            carriers.begin(), carriers.end(),
            [&](const found_carrier& c) {
                return c.tones.empty() &&
                       std::any_of(all.begin(), all.end(), [&](const found_carrier& other) {
                           return &other != &c && is_sideband_of(other, c.offset_hz, tolerance_hz);
                       });
            }),
        carriers.end());
    std::sort(carriers.begin(), carriers.end(), [](const found_carrier& a, const found_carrier& b) {
        return a.level_dbfs > b.level_dbfs;
    });
    return carriers;
}

const found_carrier& choose(const std::vector<found_carrier>& carriers) {
    const auto with_tone = std::find_if(carriers.begin(), carriers.end(),
                                        [](const found_carrier& c) { return !c.tones.empty(); });
    return with_tone != carriers.end() ? *with_tone : carriers.front();
}

/// The opening as one stretch's frames.
struct opening {
    std::vector<std::byte> own; // of a probe; else empty
    looked_at what;
};

opening look_at_opening(block_source& source, const sample_converter& converter) {
    const stream_facts& facts = source.facts();
    auto wanted = static_cast<std::size_t>(std::ceil(opening_s * facts.sample_rate_hz));
    wanted = std::min(wanted, opening_bytes / facts.frame_bytes());
    if (facts.stretches.front().count) {
        wanted = std::min(wanted, static_cast<std::size_t>(*facts.stretches.front().count));
    }
    const std::span<const std::byte> bytes = source.opening(wanted);
    return {{}, {bytes, std::min(wanted, bytes.size() / facts.frame_bytes()), &facts, &converter}};
}

/// 1 s of the recording, probe `k` of those spread over it.
opening look_at_probe(block_source& source, const sample_converter& converter, std::size_t k) {
    const stream_facts& facts = source.facts();
    const sample_index total = facts.samples().value_or(0);
    const auto length = std::min<sample_index>(total, std::llround(probe_s * facts.sample_rate_hz));
    sample_index skip =
        (total - length) * static_cast<sample_index>(k) / static_cast<sample_index>(probes - 1);
    for (const stretch_facts& stretch : facts.stretches) {
        const sample_index count = stretch.count.value_or(0);
        if (skip < count) {
            const auto take = static_cast<std::size_t>(std::min(length, count - skip));
            const std::size_t frames = std::min(take, opening_bytes / facts.frame_bytes());
            opening o{std::vector<std::byte>(frames * facts.frame_bytes()), {}};
            const std::size_t got = source.probe(stretch.first + skip, o.own);
            o.what = {std::span<const std::byte>{o.own}.first(got * facts.frame_bytes()), got,
                      &facts, &converter};
            return o;
        }
        skip -= count;
    }
    return {};
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

void note_centre(found_signal& f, const survey& s, const stream_facts& facts) {
    const line_spectrum& spectrum = s.spectrum;
    const std::size_t zero = spectrum.bin_of(0.0);
    f.image_ratio = facts.format.is_complex ? s.second_moment / 2.0 : 1.0;
    if (std::abs(f.offset_hz) >= f.width_hz || !facts.format.is_complex) {
        return;
    }
    double carrier_power = 0.0;
    for (const found_carrier& c : f.carriers) {
        carrier_power = c.offset_hz == f.offset_hz ? decibel::from_db(c.level_dbfs).power_ratio()
                                                   : carrier_power;
    }
    const bool apart = std::abs(f.offset_hz) > 2.0 * centre_bins * spectrum.bin_hz();
    if (apart && spectrum.power(zero) > line_ratio * spectrum.noise(zero)) {
        f.dc_amplitude = std::sqrt(spectrum.power(zero));
        const double dbc =
            decibel::from_power_ratio(spectrum.power(zero) / std::max(carrier_power, 1e-30)).db();
        if (dbc > noticed_dbc) {
            f.notes.add(
                {note_code::dc_in_channel, severity::warning,
                 fmt::format(
                     "the receiver's DC line lies in the channel, {:.1f} dB against the carrier",
                     dbc),
                 fmt::format("tune the receiver {} or more away from the carrier next time",
                             format_hz(2.0 * f.width_hz, 3))});
        }
    }
    const double image_db = decibel::from_amplitude_ratio(std::max(f.image_ratio, 1e-15)).db();
    if (apart && 2.0 * std::abs(f.offset_hz) < f.width_hz && image_db > noticed_dbc) {
        f.notes.add(
            {note_code::image_in_channel, severity::warning,
             fmt::format("the carrier's own image lies in the channel, {:.1f} dB against it",
                         image_db),
             fmt::format("tune the receiver {} or more away from the carrier next time",
                         format_hz(2.0 * f.width_hz, 3))});
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
        const found_carrier again =
            close_look{what, chosen.offset_hz}.describe(0.0, request.tone_hz);
        f.tone_hz = again.tones.empty() ? *request.tone_hz : again.tones.front().frequency_hz;
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
        f.notes.add({note_code::no_steady_tone, severity::info,
                     "the carrier is modulated, but no tone is steady for 1 s: speech or programme",
                     "levels are the carrier's; give --tone where there is one"});
    } else {
        f.notes.add({note_code::no_tone, severity::info, "no tone was found on the carrier",
                     "levels are the carrier's; give --tone where there is one"});
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
    opening look = look_at_opening(source, converter);
    if (look.what.frames == 0) {
        throw error{fault::malformed, "holds no samples", facts.name, "give a recording that does"};
    }
    found_signal f;
    if (static_cast<double>(look.what.frames) < short_opening_s * facts.sample_rate_hz) {
        f.notes.add({note_code::short_opening, severity::info,
                     fmt::format("only {:.2g} s could be searched for the signal",
                                 static_cast<double>(look.what.frames) / facts.sample_rate_hz),
                     "give --carrier and --tone where they are known"});
    }
    survey s = make_survey(look.what);
    found_carrier chosen;
    if (given_hz) {
        chosen = take_given(look.what, *given_hz, request);
        f.carriers.push_back(chosen);
    } else {
        f.carriers = carriers_in(look.what, s);
        for (std::size_t k = 0; f.carriers.empty() && facts.seekable && k < probes; ++k) {
            opening probe = look_at_probe(source, converter, k);
            if (probe.what.frames < least_transform) {
                continue;
            }
            survey there = make_survey(probe.what);
            f.carriers = carriers_in(probe.what, there);
            if (!f.carriers.empty()) {
                f.notes.add({note_code::late_carrier, severity::info,
                             "the carrier is not in the opening; it was found further on",
                             "levels before it came on are bounds; --from leaves them out"});
                look = std::move(probe);
                s = std::move(there);
            }
        }
        if (f.carriers.empty()) {
            throw error{fault::malformed, "no carrier stands out of the noise", facts.name,
                        "give --carrier, as an offset with a sign or as a frequency"};
        }
        chosen = choose(f.carriers);
    }
    f.offset_hz = chosen.offset_hz;
    take_tone(f, chosen, request, look.what);
    choose_width(f, request, facts);
    note_rivals(f, chosen);
    note_centre(f, s, facts);
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
