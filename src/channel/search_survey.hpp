// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <utility>
#include <vector>

#include "line_spectrum.hpp"
#include "search_opening.hpp"
#include "tonewalk/channel/signal_search.hpp"

namespace tonewalk {

/// Lines within so many bins of 0 Hz may be the receiver's own.
inline constexpr double centre_bins = 3.0;

/// The averaged spectrum of the whole band.
[[nodiscard]] line_spectrum survey(const looked_at&);
/// From segments of `size` samples.
[[nodiscard]] line_spectrum survey_of(const looked_at&, std::size_t size);

/// What was searched, and what its spectrum showed.
struct searched {
    explicit searched(opening o) : look{std::move(o)}, spectrum{survey(look.what)} {}
    opening look;
    line_spectrum spectrum;
};

/// The carriers among the lines of a survey, strongest first: not images, not sidebands; at the
/// centre only with a mirrored tone pair.
[[nodiscard]] std::vector<found_carrier> carriers_in(const searched&);

} // namespace tonewalk
