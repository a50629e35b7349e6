// SPDX-License-Identifier: GPL-3.0-or-later
#include "usage.hpp"

#include <vector>

#include <CLI/CLI.hpp>
#include <fmt/core.h>

#include "tonewalk/base/error.hpp"
#include "tonewalk/base/near_name.hpp"
#include "tonewalk/base/text.hpp"

namespace tonewalk::cli {
namespace {

bool is_program(const CLI::App& command) {
    return command.get_parent() == nullptr;
}

std::string see_help(const CLI::App& command) {
    return fmt::format("see tonewalk {}--help",
                       is_program(command) ? std::string{} : command.get_name() + " ");
}

bool looks_like_option(const std::string& word) {
    return word.size() > 1 && word.front() == '-';
}

std::vector<std::string> option_names(const CLI::App& command) {
    std::vector<std::string> names;
    for (const CLI::Option* option : command.get_options()) {
        for (const std::string& name : option->get_lnames()) {
            names.push_back("--" + name);
        }
    }
    return names;
}

std::vector<std::string> job_names(const CLI::App& program) {
    std::vector<std::string> names;
    for (const CLI::App* job : program.get_subcommands([](const CLI::App*) { return true; })) {
        names.push_back(job->get_name());
    }
    return names;
}

std::string operand_name(const CLI::App& command) {
    const auto operands =
        command.get_options([](const CLI::Option* each) { return each->get_positional(); });
    return operands.empty() ? "word" : operands.front()->get_name(true);
}

/// A word that no option or job takes.
std::string unknown_word(const CLI::App& command) {
    const std::string word = command.remaining(true).front();
    const bool option = looks_like_option(word);
    if (!option && !is_program(command)) {
        return fmt::format("{}: one {} only; {}", in_quotes(word), operand_name(command),
                           see_help(command));
    }
    const std::string typed = option ? word.substr(0, word.find('=')) : word;
    const std::string near = near_name(typed, option ? option_names(command) : job_names(command));
    return fmt::format("{}: unknown {}; {}", option ? word : in_quotes(word),
                       option ? "option" : "job",
                       near.empty() ? see_help(command) : fmt::format("did you mean {}?", near));
}

/// "--csv: 1 required FILE missing" or "--tone: At Most 1 required but received 2", in plain words.
std::string wrong_number_of_values(const std::string& complaint) {
    const std::string option = complaint.substr(0, complaint.find(':'));
    const bool missing = complaint.find("missing") != std::string::npos;
    return option + (missing ? ": needs a value; put it right after the option"
                             : ": may be given only once; leave the others out");
}

} // namespace

const CLI::App& chosen_command(const CLI::App& program) {
    const auto chosen = program.get_subcommands();
    return chosen.empty() ? program : *chosen.front();
}

std::string usage_complaint(const CLI::App& program, const CLI::ParseError& problem) {
    const CLI::App& command = chosen_command(program);
    if (dynamic_cast<const CLI::ExtrasError*>(&problem) != nullptr) {
        return unknown_word(command);
    }
    if (dynamic_cast<const CLI::ArgumentMismatch*>(&problem) != nullptr) {
        return wrong_number_of_values(problem.what());
    }
    return fmt::format("{}; {}", problem.what(), see_help(command));
}

void refuse_forgotten_values(const CLI::App& command) {
    for (const CLI::Option* option : command.get_options()) {
        if (option->get_items_expected_max() == 0) {
            continue;
        }
        const std::string name =
            option->get_positional() ? option->get_name(true) : option->get_name();
        for (const std::string& value : option->results()) {
            if (value.empty()) {
                throw error{fault::bad_request, "needs a value, not an empty one", name,
                            "put one there, or leave the option out"};
            }
            if (value.rfind("--", 0) == 0 && value.size() > 2) {
                throw error{fault::bad_request, fmt::format("needs a value, not {}", value), name,
                            "put the value right after the option"};
            }
        }
    }
}

} // namespace tonewalk::cli
