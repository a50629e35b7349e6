// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <string>
#include <string_view>

namespace tonewalk::cli {

/// Writes to standard output at once. A reader that has gone away is no fault; anything else (a
/// full disk) throws error{unwritable}.
void print_out(std::string_view text);

/// "tonewalk: LINE" on standard error, in one line whatever it holds.
void complain(const std::string& line);

inline constexpr const char* stopped_line = "stopped before there was anything to write";

/// Opens nothing behind standard descriptors that were handed over closed, so that no file of ours
/// takes their numbers and gets what was meant for people.
void keep_standard_descriptors();

} // namespace tonewalk::cli
