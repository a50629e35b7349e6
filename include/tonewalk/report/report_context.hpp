// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "tonewalk/base/note.hpp"
#include "tonewalk/base/sample.hpp"
#include "tonewalk/base/sheet.hpp"
#include "tonewalk/base/time.hpp"
#include "tonewalk/recording/stream.hpp"

namespace tonewalk {

/// What a report says of a recording that was measured.
struct recording_summary {
    std::string name, format;
    double sample_rate_hz = not_measured;
    std::optional<double> centre_hz;
    std::optional<utc_time> start_utc; ///< of the recording's first sample
    sample_index samples = 0;          ///< measured
    double duration_s = 0.0;           ///< samples / rate
    double span_s = 0.0;               ///< first to last measured sample, gaps included
    std::string sha512;                ///< empty: not computed
    bool partial = false;              ///< stopped before its end
};
/// `measured` samples from the start of what was to be measured, less than all when `partial`.
[[nodiscard]] recording_summary summarise(const stream_facts&, sample_index measured, bool partial);

/// Everything of a report but its result: who measured what, how, and what to mind.
struct report_context {
    std::string version;                       ///< of the program
    std::vector<std::string> command;          ///< as typed
    std::string job;                           ///< "levels"
    std::vector<recording_summary> recordings; ///< the first one stands alone where there is one
    std::optional<sheet> signal;               ///< nothing where several carriers were measured
    std::optional<sheet> kit;
    std::vector<sheet> verdicts;
    note_set notes;
    std::vector<std::string> cautions = general_cautions();
};

/// A table of a sheet or of its nested parts, by its key; null where there is none.
[[nodiscard]] const sheet_table* find_table(const sheet&, std::string_view key) noexcept;
/// A column of a table by its key; null where there is none.
[[nodiscard]] const sheet_column* find_column(const sheet_table&, std::string_view key) noexcept;

} // namespace tonewalk
