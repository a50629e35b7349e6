// SPDX-License-Identifier: GPL-3.0-or-later
#include <cstdio>
#include <exception>
#include <map>
#include <string>
#include <vector>

#include <CLI/CLI.hpp>
#include <fmt/core.h>

#include "jobs.hpp"
#include "print_out.hpp"
#include "tonewalk/base/error.hpp"
#include "tonewalk/base/near_name.hpp"
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

void complain(const std::string& line) {
    fmt::print(stderr, "tonewalk: {}\n", line);
}

std::vector<std::string> option_names(const CLI::App& app) {
    std::vector<std::string> names;
    for (const CLI::Option* option : app.get_options()) {
        for (const std::string& name : option->get_lnames()) {
            names.push_back("--" + name);
        }
    }
    return names;
}

/// One line for what the command line holds that no option or job takes.
std::string unknown_words(const CLI::App& app) {
    const std::string word = app.remaining(true).front();
    std::vector<std::string> names = option_names(app);
    const bool option = word.size() > 1 && word.front() == '-';
    if (!option && app.get_parent() == nullptr) {
        names.clear();
        for (const job& each : jobs) {
            names.emplace_back(each.name);
        }
    }
    const std::string near = near_name(word, names);
    const std::string mend =
        near.empty() ? fmt::format("see {} --help",
                                   app.get_parent() ? "tonewalk " + app.get_name() : "tonewalk")
                     : fmt::format("did you mean {}?", near);
    return option                        ? fmt::format("{}: unknown option; {}", word, mend)
           : app.get_parent() != nullptr ? fmt::format("\"{}\": one recording only; {}", word, mend)
                                         : fmt::format("\"{}\": unknown job; {}", word, mend);
}

/// Options that take a value refuse one that looks like an option: `--csv --quiet` forgot the file.
void refuse_option_like_values(const CLI::App& app) {
    for (const CLI::Option* option : app.get_options()) {
        for (const std::string& value : option->results()) {
            if (option->get_items_expected_max() > 0 && value.rfind("--", 0) == 0 &&
                value.size() > 2) {
                throw error{fault::bad_request, fmt::format("needs a value, not {}", value),
                            option->get_name(), "put the value right after the option"};
            }
        }
    }
}

/// "--csv: 1 required TEXT missing" or "--tone: At Most 1 required but received 2", in plain words.
std::string wrong_number_of_values(const std::string& complaint) {
    const std::string option = complaint.substr(0, complaint.find(':'));
    const bool missing = complaint.find("missing") != std::string::npos;
    return option + (missing ? ": needs a value; put it right after the option"
                             : ": may be given only once; leave the others out");
}

const CLI::App& deepest(const CLI::App& app) {
    const auto chosen = app.get_subcommands();
    return chosen.empty() ? app : *chosen.front();
}

int run(int argc, char** argv) {
    const stop_watch stopping;
    CLI::App app{"Measurements on recordings of amplitude-modulated transmitters.", "tonewalk"};
    app.set_help_flag("-h,--help", "show this, or after a job the job's options");
    app.footer("tonewalk JOB --help shows a job's options and examples.");
    bool version = false, licences = false;
    app.add_flag("--version", version, "show the version");
    app.add_flag("--licences", licences, "with --version: whose work is inside");

    std::map<const CLI::App*, job_action> actions;
    for (const job& each : jobs) {
        CLI::App* command = app.add_subcommand(each.name, each.answers);
        command->footer(fmt::format("Examples:\n{}", each.examples));
        actions[command] = each.add(*command);
    }
    try {
        app.parse(argc, argv);
        refuse_option_like_values(deepest(app));
    } catch (const CLI::CallForHelp&) {
        print_out(app.help());
        return 0;
    } catch (const CLI::ExtrasError&) {
        complain(unknown_words(deepest(app)));
        return usage_status;
    } catch (const CLI::ArgumentMismatch& problem) {
        complain(wrong_number_of_values(problem.what()));
        return usage_status;
    } catch (const CLI::ParseError& problem) {
        complain(fmt::format("{}; see tonewalk {}--help", problem.what(),
                             &deepest(app) == &app ? "" : deepest(app).get_name() + " "));
        return usage_status;
    }
    if (version) {
        print_version(licences);
        return 0;
    }
    if (app.get_subcommands().empty()) {
        complain("no job given; say tonewalk hear, levels or make, or see tonewalk --help");
        return usage_status;
    }
    try {
        return actions.at(app.get_subcommands().front())({{argv, argv + argc}, stopping});
    } catch (const stopped_early&) {
        complain("stopped before anything was measured");
        return stopping.exit_status();
    }
}

} // namespace
} // namespace tonewalk::cli

int main(int argc, char** argv) {
    using namespace tonewalk;
    try {
        return cli::run(argc, argv);
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
