// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include "search_survey.hpp"

namespace tonewalk {

/// What is to be said of what is searched: short-opening.
[[nodiscard]] note_set notes_on(const looked_at&);

/// Where the user's carrier lies, Hz from the recording's centre; nothing where none is given.
/// Throws error{bad_request} for an absolute one without a centre, error{malformed} for one outside
/// the band.
[[nodiscard]] std::optional<double> given_carrier(const search_request&, const stream_facts&);

/// The strongest line near the carrier that the user gave, or the given value itself.
[[nodiscard]] found_carrier take_given(const looked_at&, double offset_hz, const search_request&);

/// The strongest carrier with a steady tone, else the strongest; at least one is there.
[[nodiscard]] const found_carrier& choose(const std::vector<found_carrier>&);

/// What a measuring job takes: tone, width and plan for `chosen`, one of `carriers` and in the band
/// of what was searched, with the notes on all that stands in its way. Throws as find_signal does.
[[nodiscard]] found_signal take_signal(const searched&, std::vector<found_carrier> carriers,
                                       const found_carrier& chosen, const search_request&);

} // namespace tonewalk
