// SPDX-License-Identifier: GPL-3.0-or-later
#include "option_tree.hpp"

#include <algorithm>
#include <string_view>

#include <CLI/CLI.hpp>

#include "tonewalk/base/text.hpp"

namespace tonewalk::cli {
namespace {

std::vector<std::string> parts_of(std::string_view text, char between) {
    std::vector<std::string> parts;
    while (!text.empty()) {
        const std::string_view part = text.substr(0, text.find(between));
        parts.emplace_back(trimmed(part));
        text.remove_prefix(std::min(text.size(), part.size() + 1));
    }
    return parts;
}

std::vector<std::string> names_of(const CLI::Option& option) {
    if (option.get_positional()) {
        return {option.get_name(true)};
    }
    std::vector<std::string> names;
    for (const std::string& name : option.get_snames()) {
        names.push_back("-" + name);
    }
    for (const std::string& name : option.get_lnames()) {
        names.push_back("--" + name);
    }
    return names;
}

option_facts facts_of(const CLI::Option& option) {
    const bool flag = option.get_items_expected_max() == 0;
    return {.names = names_of(option),
            .value = flag ? std::string{} : option.get_type_name(),
            .text = option.get_description(),
            .initial = flag ? std::string{} : option.get_default_str(),
            .required = option.get_required()};
}

command_facts command_of(const CLI::App& app) {
    command_facts command{.name = app.get_parent() != nullptr ? app.get_name() : std::string{},
                          .answers = app.get_description(),
                          .examples = parts_of(app.get_footer(), '\n'),
                          .operands = {},
                          .groups = {}};
    for (const std::string& title : app.get_groups()) {
        option_group group{title, {}};
        for (const CLI::Option* option : app.get_options([&](const CLI::Option* each) {
                 return each->get_group() == title && each != app.get_help_ptr();
             })) {
            auto& into = option->get_positional() ? command.operands : group.options;
            into.push_back(facts_of(*option));
        }
        if (!group.options.empty()) {
            command.groups.push_back(std::move(group));
        }
    }
    command.groups.back().options.push_back(facts_of(*app.get_help_ptr()));
    return command;
}

} // namespace

std::vector<std::string> choices_of(const option_facts& option) {
    std::vector<std::string> words = parts_of(option.value, '|');
    const auto stands_for_something = [](const std::string& word) {
        return word != lower_case(word);
    };
    words.erase(std::remove_if(words.begin(), words.end(), stands_for_something), words.end());
    return words;
}

bool names_file(const option_facts& option) {
    return option.value == "FILE" || option.value == "BASE";
}

bool takes_value(const option_facts& option) {
    return !option.value.empty();
}

std::vector<option_facts> options_of(const command_facts& command) {
    std::vector<option_facts> all;
    for (const option_group& group : command.groups) {
        all.insert(all.end(), group.options.begin(), group.options.end());
    }
    return all;
}

option_tree read_option_tree(const CLI::App& program) {
    option_tree tree{command_of(program), {}};
    for (const CLI::App* job : program.get_subcommands([](const CLI::App*) { return true; })) {
        tree.jobs.push_back(command_of(*job));
    }
    return tree;
}

const std::vector<exit_meaning>& exit_meanings() {
    static const std::vector<exit_meaning> meanings{
        {"0", "done"},
        {"2", "the command line is wrong, or lacks what this recording needs"},
        {"3", "an input cannot be used, or a value does not fit it"},
        {"4", "an output could not be written, or exists already"},
        {"5", "a fault of the program itself"},
        {"130, 143", "stopped by SIGINT or SIGTERM; what was measured is written"}};
    return meanings;
}

} // namespace tonewalk::cli
