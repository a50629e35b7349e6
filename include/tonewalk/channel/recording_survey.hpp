// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <optional>
#include <stop_token>
#include <vector>

#include "tonewalk/channel/iq_balance.hpp"
#include "tonewalk/channel/signal_search.hpp"

namespace tonewalk {

/// What a recording holds, from stretches of 1 s spread over it.
struct recording_survey {
    /// Strongest first, each as it showed where it was strongest with a steady tone, else where it
    /// was strongest. Empty: none stands out.
    std::vector<found_carrier> carriers;
    double noise_density_dbfs_hz = not_measured; ///< white floor under all lines
    std::optional<iq_balance> balance;           ///< nothing where no line shows an image's place
    curve spectrum;                              ///< mean over what was looked at
    /// What a measuring job would take where that carrier showed best; its notes are among `notes`.
    std::optional<found_signal> best;
    note_set notes;
};

/// Looks at 16 stretches of 1 s (a file), at the first 2 s (a pipe, a short file); at most 32 MiB
/// each, one after another. A carrier that drifts less than 100 Hz from one to the next is one
/// carrier. `mend_iq` has no effect: the survey shows the recording as it is. A stop ends it with
/// what it has seen, one look at least. Throws error{bad_request, malformed} as find_signal does
/// for what the user says of the signal, and for a recording without samples; that nothing is found
/// is no error.
[[nodiscard]] recording_survey survey_recording(block_source&, const search_request& = {},
                                                const std::stop_token& = {});

/// noise_density_dbfs_hz, iq_gain_error_db and iq_phase_error_deg with _u95, carriers; and the
/// spectrum.
[[nodiscard]] sheet describe(const recording_survey&, const stream_facts&);

} // namespace tonewalk
