// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include "tonewalk/base/output_file.hpp"
#include "tonewalk/base/sheet.hpp"

namespace tonewalk {

/// One table as CSV: UTF-8 without a byte-order mark, commas, LF, one header row with the JSON
/// names; null is empty, numbers are the shortest that read back equal, text is quoted where RFC
/// 4180 wants it. Written row by row; the caller commits the file.
void write_csv(output_file&, const sheet_table&);

} // namespace tonewalk
