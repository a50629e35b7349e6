// SPDX-License-Identifier: GPL-3.0-or-later
#include "help_text.hpp"

#include <algorithm>
#include <cstddef>

#include <fmt/core.h>
#include <fmt/format.h>
#include <fmt/ranges.h>

#include "tonewalk/base/text.hpp"

namespace tonewalk::cli {
namespace {

constexpr std::size_t indent = 2, label_columns = 24;

/// Two columns: a label, and its text broken into lines beside it; below it where the screen is
/// narrow or the label long.
class page {
public:
    explicit page(int columns)
        : columns_{std::min<std::size_t>(80, static_cast<std::size_t>(std::max(40, columns)))} {}

    void heading(std::string_view title) { text_ += fmt::format("\n{}:\n", title); }
    void line(std::string_view words) { text_ += fmt::format("{}\n", words); }
    void paragraph(std::string_view words, std::size_t from = 0) {
        for (const std::string& each : wrapped_lines(words, columns_ - from)) {
            text_ += std::string(from, ' ') + each + '\n';
        }
    }
    void entry(const std::string& label, std::string_view words) {
        const std::size_t beside = columns_ >= 64 ? indent + label_columns : 6;
        text_ += std::string(indent, ' ') + label;
        std::size_t used = indent + label.size();
        if (used + 2 > beside) {
            text_ += '\n';
            used = 0;
        }
        for (const std::string& each : wrapped_lines(words, columns_ - beside)) {
            text_ += std::string(beside - used, ' ') + each + '\n';
            used = 0;
        }
    }
    [[nodiscard]] std::string take() { return std::move(text_); }

private:
    std::size_t columns_;
    std::string text_;
};

std::string label_of(const option_facts& option) {
    std::string label = fmt::format("{}", fmt::join(option.names, ", "));
    return takes_value(option) ? label + ' ' + option.value : label;
}

std::string words_of(const option_facts& option) {
    std::string words = option.text;
    if (!option.initial.empty()) {
        words += fmt::format(" (default {})", option.initial);
    }
    return option.required && option.names.front().front() == '-' ? words + " (must be given)"
                                                                  : words;
}

void put_groups(page& into, const command_facts& command) {
    for (const option_group& group : command.groups) {
        into.heading(group.title);
        for (const option_facts& option : group.options) {
            into.entry(label_of(option), words_of(option));
        }
    }
}

std::string operands_of(const command_facts& job) {
    std::string words;
    for (const option_facts& operand : job.operands) {
        words += operand.names.front() + ' ';
    }
    for (const option_group& group : job.groups) {
        for (const option_facts& option : group.options) {
            if (option.required) {
                words += fmt::format("{} {} ", option.names.front(), option.value);
            }
        }
    }
    return words;
}

void put_examples(page& into, const std::vector<std::string>& examples) {
    into.heading("Examples");
    for (const std::string& example : examples) {
        into.line(std::string(indent, ' ') + example);
    }
}

} // namespace

std::string help_text(const option_tree& tree, int columns) {
    page text{columns};
    text.paragraph(tree.program.answers);
    text.heading("Usage");
    text.line("  tonewalk JOB [options]");
    text.line("  tonewalk JOB --help");
    text.heading("Jobs");
    for (const command_facts& job : tree.jobs) {
        text.entry(job.name, job.answers);
    }
    put_groups(text, tree.program);
    text.heading("Exit status");
    for (const exit_meaning& each : exit_meanings()) {
        text.entry(each.status, each.meaning);
    }
    put_examples(text, tree.program.examples);
    return text.take();
}

std::string help_text(const command_facts& job, int columns) {
    page text{columns};
    text.paragraph(job.answers);
    text.heading("Usage");
    text.paragraph(fmt::format("tonewalk {} {}[options]", job.name, operands_of(job)), indent);
    text.line("");
    for (const option_facts& operand : job.operands) {
        text.entry(operand.names.front(), operand.text);
    }
    put_groups(text, job);
    put_examples(text, job.examples);
    return text.take();
}

} // namespace tonewalk::cli
