// SPDX-License-Identifier: GPL-3.0-or-later
#include "man_page.hpp"

#include <algorithm>
#include <string_view>

#include <fmt/core.h>
#include <fmt/format.h>
#include <fmt/ranges.h>

namespace tonewalk::cli {
namespace {

/// Fit to stand anywhere in a line of roff.
std::string plain(std::string_view text) {
    std::string safe;
    for (const char letter : text) {
        switch (letter) {
        case '\\':
            safe += "\\e";
            break;
        case '-':
            safe += "\\-";
            break;
        case '\'':
            safe += "\\(aq";
            break;
        default:
            safe += letter;
        }
    }
    return safe.rfind('.', 0) == 0 ? "\\&" + safe : safe;
}

std::string bold(std::string_view text) {
    return fmt::format("\\fB{}\\fR", plain(text));
}

/// Words to be typed stand bold, what stands for something in italics.
std::string value_of(const option_facts& option) {
    const std::vector<std::string> choices = choices_of(option);
    std::string form;
    std::string_view left = option.value;
    while (!left.empty()) {
        const std::string_view part = left.substr(0, left.find('|'));
        const bool typed = std::find(choices.begin(), choices.end(), part) != choices.end();
        form += fmt::format("{}{}", form.empty() ? "" : "|",
                            typed ? bold(part) : fmt::format("\\fI{}\\fR", plain(part)));
        left.remove_prefix(std::min(left.size(), part.size() + 1));
    }
    return form;
}

std::string entry(const option_facts& option) {
    std::vector<std::string> names;
    for (const std::string& name : option.names) {
        names.push_back(name.front() == '-' ? bold(name) : fmt::format("\\fI{}\\fR", plain(name)));
    }
    const bool operand = option.names.front().front() != '-';
    std::string text = fmt::format(".TP\n{}{}{}\n{}", fmt::join(names, ", "),
                                   takes_value(option) && !operand ? " " : "",
                                   operand ? "" : value_of(option), plain(option.text));
    if (!option.initial.empty()) {
        text += fmt::format(" (default {})", plain(option.initial));
    }
    return text + (option.required && !operand ? " (must be given)\n" : "\n");
}

std::vector<option_facts> shared_options(const option_tree& tree) {
    std::vector<option_facts> met, shared;
    const auto holds = [](const std::vector<option_facts>& list, const option_facts& each) {
        return std::find(list.begin(), list.end(), each) != list.end();
    };
    for (const command_facts& job : tree.jobs) {
        for (const option_facts& option : options_of(job)) {
            if (holds(met, option) && !holds(shared, option)) {
                shared.push_back(option);
            }
            met.push_back(option);
        }
    }
    return shared;
}

std::string examples_of(const std::vector<std::string>& examples) {
    std::string text;
    for (const std::string& example : examples) {
        text += fmt::format("{}\n", plain(example));
    }
    return fmt::format(".PP\n.EX\n{}.EE\n", text);
}

std::string job_section(const command_facts& job, const std::vector<option_facts>& shared) {
    std::string text = fmt::format(".SS {}\n{}\n", job.name, plain(job.answers));
    for (const option_facts& operand : job.operands) {
        text += entry(operand);
    }
    std::vector<std::string> told_below;
    for (const option_facts& option : options_of(job)) {
        if (std::find(shared.begin(), shared.end(), option) != shared.end()) {
            told_below.push_back(bold(option.names.back()));
        } else {
            text += entry(option);
        }
    }
    text += fmt::format(".PP\nShared with other jobs and told below: {}.\n",
                        fmt::join(told_below, ", "));
    return text + examples_of(job.examples);
}

std::string exit_section() {
    std::string text = ".SH EXIT STATUS\n";
    for (const exit_meaning& each : exit_meanings()) {
        text += fmt::format(".TP\n.B {}\n{}\n", each.status, plain(each.meaning));
    }
    return text;
}

} // namespace

std::string man_page(const option_tree& tree) {
    const std::vector<option_facts> shared = shared_options(tree);
    std::string text = fmt::format(
        ".TH TONEWALK 1 \"\" \"tonewalk {}\" \"User Commands\"\n"
        ".SH NAME\ntonewalk \\- measurements on recordings of amplitude\\-modulated transmitters\n"
        ".SH SYNOPSIS\n.B tonewalk\n.I JOB\n[options]\n"
        ".br\n.B tonewalk\n.I JOB\n.B \\-\\-help\n"
        ".SH DESCRIPTION\n{}\n"
        "Results go to standard output, remarks, progress and complaints to standard error.\n"
        "A complaint is one line: where, what, and how to mend it.\n"
        "Outputs appear whole or not at all, and replace nothing without\n{}.\n.SH OPTIONS\n",
        plain(TONEWALK_VERSION), plain(tree.program.answers), bold("--force"));
    for (const option_facts& option : options_of(tree.program)) {
        text += entry(option);
    }
    text += ".SH JOBS\n";
    for (const command_facts& job : tree.jobs) {
        text += job_section(job, shared);
    }
    text += ".SH SHARED OPTIONS\n";
    for (const option_facts& option : shared) {
        text += entry(option);
    }
    text += exit_section();
    text += ".SH ENVIRONMENT\n.TP\n.B NO_COLOR\nWhere it is set, nothing is coloured.\n";
    return text + ".SH EXAMPLES\n" + examples_of(tree.program.examples);
}

} // namespace tonewalk::cli
