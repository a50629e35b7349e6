// SPDX-License-Identifier: GPL-3.0-or-later
#include <memory>

#include <CLI/CLI.hpp>
#include <fmt/core.h>

#include "jobs.hpp"
#include "options.hpp"
#include "print_out.hpp"
#include "tonewalk/scene/make_recording.hpp"

namespace tonewalk::cli {
namespace {

struct make_options {
    std::string scene, base;
    bool quiet = false, force = false;
};

int run_make(const make_options& o, const program& program) {
    const scene what = read_scene(o.scene);
    progress_line progress{o.quiet ? progress_choice::never : progress_choice::automatic,
                           what.rate_hz};
    program.stopping.hold_results();
    const made_recording made =
        make_recording(what, o.base, o.force,
                       {.stop = program.stopping.token(), .progress = &progress, .threads = 1});
    if (made.stopped) {
        complain(stopped_line);
        return program.stopping.exit_status();
    }
    if (!o.quiet) {
        print_out(fmt::format("{}\n{}\n{}\n{} samples, SHA-512 {}...\n", made.metadata.string(),
                              made.data.string(), made.truth.string(), made.samples,
                              made.sha512.substr(0, 16)));
    }
    return 0;
}

} // namespace

job_action add_make(CLI::App& app) {
    const auto o = std::make_shared<make_options>();
    app.add_option("SCENE", o->scene, "scene file, see docs/jobs/make.md")
        ->type_name("FILE")
        ->required();
    app.add_option("-o,--output", o->base, "base name of the three files that are written")
        ->type_name("BASE")
        ->group("Outputs")
        ->required();
    app.add_flag("--quiet", o->quiet, "hide progress and the names of what was written")
        ->group("Running")
        ->group("Running");
    app.add_flag("--force", o->force, "replace files that exist")
        ->group("Running")
        ->group("Running");
    return [o](const program& program) { return run_make(*o, program); };
}

} // namespace tonewalk::cli
