// SPDX-License-Identifier: GPL-3.0-or-later
#include <algorithm>
#include <cstdio>
#include <exception>
#include <map>
#include <string>
#include <vector>

#include <CLI/CLI.hpp>
#include <fmt/core.h>
#include <fmt/ranges.h>
#include <unistd.h>

#include "completion.hpp"
#include "help_text.hpp"
#include "jobs.hpp"
#include "man_page.hpp"
#include "option_tree.hpp"
#include "options.hpp"
#include "print_out.hpp"
#include "screen.hpp"
#include "tonewalk/base/error.hpp"
#include "usage.hpp"
#include "version.hpp"

namespace tonewalk::cli {
namespace {

constexpr int usage_status = 2, own_fault_status = 5;

struct job {
    const char* name;
    const char* answers;
    job_action (*add)(CLI::App&);
    const char* examples;
};

constexpr job jobs[] = {
    {"look", "What a recording holds, and whether its levels can be trusted.", add_look,
     "  tonewalk look walk.sigmf-meta\n"
     "  tonewalk look walk.sigmf-meta --verify --json look.json\n"
     "  tonewalk look raw.iq --format ci16_le --rate 2.4M --centre 145.2M"},
    {"hear", "Recover the audio.", add_hear,
     "  tonewalk hear walk.sigmf-meta -o walk.wav\n"
     "  tonewalk hear walk.sigmf-meta --loudness steady --band 300:3k -o walk.flac"},
    {"levels", "Carrier and tone level against time; peaks and nulls.", add_levels,
     "  tonewalk levels walk.sigmf-meta\n"
     "  tonewalk levels walk.sigmf-meta --tone 1k --csv walk.csv --json walk.json\n"
     "  tonewalk levels - --format ci16_le --rate 2.4M --carrier +120k < raw.iq"},
    {"make", "Write a recording with known truth from a scene.", add_make,
     "  tonewalk make scene.toml -o scene"},
};

constexpr const char* program_examples =
    "  tonewalk levels walk.sigmf-meta --csv walk.csv --json walk.json\n"
    "  tonewalk hear walk.sigmf-meta -o walk.wav\n"
    "  receiver | tonewalk levels - --format ci16_le --rate 2.4M";

/// What the program does without a job.
struct program_options {
    bool version = false, licences = false, manual = false;
    std::string shell;

    void add_to(CLI::App& app) {
        app.set_help_flag("-h,--help", "show this; after a job, the job's options and examples");
        app.add_flag("--version", version, "show the version");
        app.add_flag("--licences", licences, "with --version: whose work is inside");
        app.add_flag("--man", manual, "print the manual page, as man reads it");
        app.add_option("--completion", shell,
                       "print a script that lets a shell complete the command")
            ->type_name(fmt::format("{}", fmt::join(completion_shells, "|")));
    }
};

/// Answers what needs no job: 0, or 2 where there is neither job nor question.
int run_without_job(const program_options& o, const option_tree& tree) {
    if (o.version) {
        print_version(o.licences);
    } else if (o.manual) {
        print_out(man_page(tree));
    } else if (!o.shell.empty()) {
        chosen("--completion", o.shell, completion_shells);
        print_out(completion_script(tree, o.shell));
    } else {
        std::vector<std::string> names;
        for (const command_facts& job : tree.jobs) {
            names.push_back(job.name);
        }
        complain(fmt::format("no job given; give one of {}, or see tonewalk --help",
                             fmt::join(names, ", ")));
        return usage_status;
    }
    return 0;
}

void print_help(const CLI::App& app) {
    const option_tree tree = read_option_tree(app);
    const std::string job = chosen_command(app).get_name();
    const auto found = std::find_if(tree.jobs.begin(), tree.jobs.end(),
                                    [&job](const command_facts& each) { return each.name == job; });
    const int columns = screen_columns(STDOUT_FILENO);
    print_out(found == tree.jobs.end() ? help_text(tree, columns) : help_text(*found, columns));
}

int run_program(int argc, char** argv) {
    keep_standard_descriptors();
    const stop_watch stopping;
    CLI::App app{"Measurements on recordings of amplitude-modulated transmitters.", "tonewalk"};
    app.footer(program_examples);
    program_options o;
    o.add_to(app);
    std::map<const CLI::App*, job_action> actions;
    for (const job& each : jobs) {
        CLI::App* command = app.add_subcommand(each.name, each.answers);
        command->footer(each.examples);
        actions[command] = each.add(*command);
    }
    try {
        app.parse(argc, argv);
    } catch (const CLI::CallForHelp&) {
        print_help(app);
        return 0;
    } catch (const CLI::ParseError& problem) {
        complain(usage_complaint(app, problem));
        return usage_status;
    }
    refuse_forgotten_values(app);
    refuse_forgotten_values(chosen_command(app));
    if (app.get_subcommands().empty()) {
        return run_without_job(o, read_option_tree(app));
    }
    try {
        return actions.at(app.get_subcommands().front())({{argv, argv + argc}, stopping});
    } catch (const stopped_early&) {
        complain(stopped_line);
        return stopping.exit_status();
    }
}

} // namespace
} // namespace tonewalk::cli

int main(int argc, char** argv) {
    using namespace tonewalk;
    try {
        return cli::run_program(argc, argv);
    } catch (const error& problem) {
        cli::complain(problem.what());
        return problem.exit_status();
    } catch (const std::exception& problem) {
        cli::complain(
            fmt::format("fault of the program itself: {}; please report this line with the command "
                        "and tonewalk --version",
                        problem.what()));
        return cli::own_fault_status;
    }
}
