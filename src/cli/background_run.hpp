// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <string>

#include "measurement.hpp"
#include "tonewalk/meter/background.hpp"

namespace tonewalk::cli {

/// What stands there, and what speaks against the recording that says so.
struct background_run {
    background_lines lines;
    note_set doubts;
};

/// Measures a recording of the transmitter switched off at the lines and through the channel that
/// `on` measures, record by record like it. Its format, rate and centre are read as those of the
/// recording itself.
[[nodiscard]] background_run run_background(const std::string& path, recording_options,
                                            const measurement& on, const line_meter::config&,
                                            const running_options&, const program&);

} // namespace tonewalk::cli
