// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include "search_survey.hpp"

namespace tonewalk {

/// Fills f.dc_amplitude and f.image_ratio, and notes the receiver's own lines in the channel of a
/// carrier `offset_hz` from the centre of the stretch that was searched.
void note_receiver(found_signal& f, double offset_hz, const found_carrier&, const searched&);

} // namespace tonewalk
