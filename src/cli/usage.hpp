// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <string>

namespace CLI { // NOLINT(readability-identifier-naming)
class App;
class ParseError;
} // namespace CLI

namespace tonewalk::cli {

/// The job that the command line names, or the program itself.
[[nodiscard]] const CLI::App& chosen_command(const CLI::App& program);

/// One line for what is wrong with the command line, with the nearest name where one is near.
[[nodiscard]] std::string usage_complaint(const CLI::App& program, const CLI::ParseError&);

/// Throws error{bad_request} where a value is empty, or looks like an option: `--csv --quiet`
/// forgot the file.
void refuse_forgotten_values(const CLI::App& command);

} // namespace tonewalk::cli
