// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <string>

#include "tonewalk/base/sheet.hpp"
#include "tonewalk/meter/level_log.hpp"

namespace tonewalk {

/// What stands at one measured line while the transmitter is off. It adds to the line in power on
/// average, and in one record by its amplitude in either direction, because its phase is unknown.
struct background_line {
    double power = 0.0; ///< amplitude^2, full scale = 1, noise taken off; never negative
    double bound = 0.0; ///< amplitude that it does not exceed, 97.5 %
};

/// Of carrier and tone, from a recording with the transmitter off.
struct background_lines {
    background_line carrier, tone;
};

/// From the log of that recording, measured with the same channel, window and frequencies. Means of
/// linear power over all records; what noise alone would show is no background but bounds it.
/// Throws error{malformed} naming `where` when no record could be measured.
[[nodiscard]] background_lines background_of(const level_log& transmitter_off,
                                             const std::string& where);

/// carrier_dbfs, tone_dbfs: null with _high95 where nothing stands out.
[[nodiscard]] sheet describe(const background_lines&);

/// Whether the background could make up the whole line, of which it left this power: then there is
/// only a bound.
[[nodiscard]] bool hidden_by(const background_line&, double power_left) noexcept;

/// background-limited, where records of the quantity in use are only bounded for that reason.
void add_background_note(level_log&, quantity used);

} // namespace tonewalk
