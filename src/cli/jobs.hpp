// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <functional>
#include <string>
#include <vector>

#include "signals.hpp"

namespace CLI { // NOLINT(readability-identifier-naming)
class App;
}

namespace tonewalk::cli {

/// What a job is told besides its own options.
struct program {
    std::vector<std::string> command; ///< as typed
    const stop_watch& stopping;
};

/// Thrown where a signal stopped the program before anything was measured.
struct stopped_early {};

/// Runs a job whose options have been read; returns the exit status.
using job_action = std::function<int(const program&)>;

/// Each adds its options to the job's own command and returns what to do once they are read.
job_action add_hear(CLI::App&);
job_action add_levels(CLI::App&);
job_action add_look(CLI::App&);
job_action add_make(CLI::App&);

} // namespace tonewalk::cli
