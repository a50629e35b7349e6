// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <string>
#include <vector>

namespace CLI { // NOLINT(readability-identifier-naming)
class App;
}

namespace tonewalk::cli {

/// The command line in neutral form, read from what parses it: help, man page and completions tell
/// of the same options.

struct option_facts {
    std::vector<std::string> names; ///< "-o", "--output"; an operand's own: "RECORDING"
    std::string value;              ///< form of its value, see below; empty for a flag
    std::string text;               ///< what it does
    std::string initial;            ///< its default, as typed; empty where there is none to show
    bool required = false;

    bool operator==(const option_facts&) const = default;
};

/// A value's form is alternatives between bars: a word in small letters is typed as it stands
/// ("auto|HZ": auto or a frequency), one in capitals stands for something.
[[nodiscard]] std::vector<std::string> choices_of(const option_facts&); ///< the words to type
[[nodiscard]] bool names_file(const option_facts&);
[[nodiscard]] bool takes_value(const option_facts&);

struct option_group {
    std::string title;
    std::vector<option_facts> options;
};

/// A job, or the program itself, whose name is empty.
struct command_facts {
    std::string name, answers;
    std::vector<std::string> examples;  ///< command lines
    std::vector<option_facts> operands; ///< what stands without an option's name
    std::vector<option_group> groups;
};

[[nodiscard]] std::vector<option_facts> options_of(const command_facts&); ///< of all groups

struct option_tree {
    command_facts program;
    std::vector<command_facts> jobs;
};
[[nodiscard]] option_tree read_option_tree(const CLI::App& program);

/// What an exit status says, in ascending order.
struct exit_meaning {
    const char* status;
    const char* meaning;
};
[[nodiscard]] const std::vector<exit_meaning>& exit_meanings();

} // namespace tonewalk::cli
