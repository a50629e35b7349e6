// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstdint>
#include <optional>
#include <vector>

#include "input_file.hpp"
#include "tonewalk/recording/sigmf_metadata.hpp"
#include "tonewalk/recording/stream.hpp"

namespace tonewalk {

/// A stretch and the bytes in the data that are not samples before it: frame n of the recording, if
/// it is in this stretch, lies header_bytes + n x frame bytes from the data's first byte.
struct placed_stretch {
    stretch_facts facts;
    std::int64_t header_bytes = 0;
};

/// Where the samples of a recording lie.
struct data_layout {
    std::vector<placed_stretch> stretches;
    std::optional<utc_time> start_utc;
    std::int64_t odd_bytes = 0; ///< of a last partial frame
};

/// Headerless frames without metadata: one stretch.
[[nodiscard]] data_layout lay_out_frames(std::int64_t data_bytes, std::size_t frame_bytes);

/// SigMF segments: a stretch ends where samples are missing, where the centre changes, and where
/// header bytes intervene. Captures beyond the data are ignored. Throws error{malformed}, `name` in
/// its line.
[[nodiscard]] data_layout lay_out_segments(const sigmf_metadata&, std::int64_t data_bytes,
                                           std::size_t frame_bytes, double rate_hz,
                                           const std::string& name);

/// What a recording says of itself where an option may say otherwise.
struct stated_facts {
    std::optional<double> rate_hz;
    std::vector<std::string> overridden; ///< remarks, for one note
};

/// Puts the request's options over `facts`, whose stretches are the whole recording's and whose
/// rate already is the one to use: exchange and mirror, lane, start, centre, and the part from
/// `from` until `until`. Returns, for each stretch kept, the index of the one it was cut from.
/// Throws error{bad_request, malformed}.
[[nodiscard]] std::vector<std::size_t> apply(const recording_request&, stated_facts,
                                             stream_facts& facts);

/// The rate to use: the option's, else the recording's. Throws error{bad_request} without either.
[[nodiscard]] double rate_to_use(const recording_request&, std::optional<double> stated_hz,
                                 const std::string& name);

void note_odd_tail(note_set&, std::int64_t bytes, std::size_t frame_bytes);
/// Raises samples-missing where the stretches that are left have time between them.
void note_missing_samples(stream_facts&);

} // namespace tonewalk
