// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <algorithm>
#include <optional>

#include "tonewalk/channel/signal_search.hpp"

namespace tonewalk {

inline constexpr double least_width_hz = 2000.0;

/// The width that a channel takes when none is given: the tone's third harmonic fits; 20 kHz where
/// there is no tone; no more than the band holds.
struct channel_width {
    double wanted_hz = 0.0;
    double room_hz = 0.0;  ///< about the carrier, until the band ends
    double least_hz = 0.0; ///< must be exceeded: the tone's lines lie there
    [[nodiscard]] double hz() const noexcept { return std::min(wanted_hz, room_hz); }
    [[nodiscard]] bool fits() const noexcept { return hz() > least_hz && hz() > 0.0; }
};
/// `offset_hz` from the centre of the stretch.
[[nodiscard]] channel_width automatic_width(double offset_hz, std::optional<double> tone_hz,
                                            const stream_facts&) noexcept;

/// Fills f.width_hz as asked for, or automatically; drops a tone outside a width that was given.
/// Throws error{malformed} where a width does not fit.
void choose_width(found_signal& f, double offset_hz, const search_request&, const stream_facts&);

} // namespace tonewalk
