// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include "tonewalk/base/output_file.hpp"
#include "tonewalk/base/sheet.hpp"
#include "tonewalk/report/report_context.hpp"

namespace tonewalk {

/// Rises when a field goes or changes its meaning or unit.
inline constexpr int json_schema_version = 1;

struct json_report_options {
    bool curves = true; ///< everything a page would draw
};

/// The whole result as one JSON document (docs/results.md, docs/results.schema.json), written as a
/// stream: columns are asked row by row and never copied. Curves of nested parts stand beside those
/// of the result; a name that comes again gets "_2", "_3" ... The caller commits the file.
void write_json(output_file&, const report_context&, const sheet& result, json_report_options = {});

} // namespace tonewalk
