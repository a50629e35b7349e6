// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/channel/signal_search.hpp"

#include <algorithm>
#include <cmath>

#include "image_fit.hpp"
#include "search_survey.hpp"
#include "signal_choice.hpp"
#include "tonewalk/base/error.hpp"

namespace tonewalk {
namespace {

constexpr double least_image_bound = 1e-3; // -60 dB: what no note would speak of

error cannot_mend(std::string_view why) {
    return error{fault::malformed, why, "--mend-iq", "leave it out"};
}

/// The image that the strong lines show; one that cannot be told from other signals at the mirror
/// places would put in more than it takes out.
iq_balance balance_to_mend(const searched& s) {
    if (!s.look.what.facts->format.is_complex) {
        throw cannot_mend("real samples have no image that could be removed");
    }
    image_fit images;
    images.add(s.look.what, s.spectrum);
    const std::optional<iq_balance> balance = images.result();
    if (!balance) {
        throw cannot_mend(
            "no line is strong enough and far enough from the centre to show its image");
    }
    if (balance->image_ratio_u95 > std::max(least_image_bound, std::abs(balance->image_ratio))) {
        throw cannot_mend("the image cannot be told from noise and other signals in its place");
    }
    return *balance;
}

/// The carriers of the opening, else of the first probe of a file that holds any; `s` becomes what
/// they were found in.
std::vector<found_carrier> find_carriers(searched& s, block_source& source,
                                         const sample_converter& converter) {
    std::vector<found_carrier> carriers = carriers_in(s);
    for (std::size_t k = 0; carriers.empty() && source.facts().seekable && k < most_probes; ++k) {
        opening probe = look_at_probe(source, converter, k);
        if (probe.what.frames >= least_frames_searched) {
            s = searched{std::move(probe)};
            carriers = carriers_in(s);
        }
    }
    if (carriers.empty()) {
        throw error{fault::malformed, "no carrier stands out of the noise", source.facts().where(),
                    "give --carrier, as an offset with a sign or as a frequency; check --format "
                    "and --rate where the recording does not say them"};
    }
    return carriers;
}

note_set notes_on_finding(const note_set& about_opening, const searched& s) {
    note_set notes = about_opening;
    if (s.look.is_probe()) {
        notes.add({note_code::late_carrier, severity::info,
                   "the carrier is not in the opening; it was found further on",
                   "levels before it came on are bounds; --from leaves them out"});
    }
    return notes;
}

} // namespace

found_signal find_signal(block_source& source, const search_request& request) {
    const stream_facts& facts = source.facts();
    const std::optional<double> given_hz = given_carrier(request, facts);
    sample_converter converter{facts}; // all that is looked at goes through this one
    searched s{look_at_opening(source, converter)};
    const note_set about_opening = notes_on(s.look.what);
    const auto find = [&] {
        return given_hz ? std::vector{take_given(s.look.what, *given_hz, request)}
                        : find_carriers(s, source, converter);
    };
    std::vector<found_carrier> carriers = find();
    std::optional<iq_balance> mended;
    if (request.mend_iq) {
        mended = balance_to_mend(s);
        converter = sample_converter{facts, mended->image_ratio};
        s.spectrum = survey(s.look.what);
        carriers = find();
    }
    found_signal f = take_signal(s, carriers, choose(carriers), request);
    note_set notes = notes_on_finding(about_opening, s);
    notes.merge(f.notes);
    f.notes = notes;
    f.mended = mended;
    return f;
}

} // namespace tonewalk
