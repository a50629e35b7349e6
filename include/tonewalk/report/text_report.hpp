// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <string>
#include <vector>

#include "tonewalk/base/note.hpp"
#include "tonewalk/base/sheet.hpp"
#include "tonewalk/report/report_context.hpp"

namespace tonewalk {

struct text_report_options {
    int columns = 80;             ///< of the screen; from 40 up everything fits
    bool colour = false;          ///< a little, by terminal escapes
    bool info_notes = true;       ///< false: warnings alone
    bool verdict_first = false;   ///< warnings stand in the summary, before any figure
    std::string plot_column = {}; ///< of the table "log": "tone_dbfs"; empty: no plot
    std::size_t table_rows = 20;  ///< longer tables are cut, saying so
};

/// The result for people: what was measured, what speaks against it where asked for, entries one
/// below the other with their uncertainty, tables, a small plot of the log. Control characters of
/// foreign text are replaced.
[[nodiscard]] std::string summary_text(const report_context&, const sheet& result,
                                       const text_report_options&);

/// One paragraph a note: "warning weak-tone: what was seen; what to do".
[[nodiscard]] std::string notes_text(const note_set&, const text_report_options&);

[[nodiscard]] std::string cautions_text(const std::vector<std::string>& cautions,
                                        const text_report_options&);

} // namespace tonewalk
