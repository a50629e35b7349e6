// SPDX-License-Identifier: GPL-3.0-or-later
#include "background_run.hpp"

#include "tonewalk/base/error.hpp"

namespace tonewalk::cli {

namespace {

/// The warnings about the background's own samples, naming it.
note_set doubts_of(const measurement& off, const std::string& path) {
    note_set all = off.facts().notes, named;
    all.merge(off.watch.result().doubts);
    for (note each : all.all()) {
        if (each.level == severity::warning) {
            each.text = "background " + path + ": " + each.text;
            named.add(std::move(each));
        }
    }
    return named;
}

} // namespace

background_run run_background(const std::string& path, recording_options recording,
                              const measurement& on, const line_meter::config& as_measured,
                              const running_options& running, const program& program) {
    recording.recording = path;
    recording.from = recording.until = recording.member = {};
    recording.verify = false;
    std::unique_ptr<block_source> source = open_recording(recording.request());
    found_signal found = on.found;
    if (!found.plan.absolute && on.facts().centre_hz && source->facts().centre_hz) {
        found.plan.carrier_hz += *on.facts().centre_hz; // it may lie elsewhere in this band
        found.plan.absolute = true;
    }
    measurement off = measurement_of(std::move(source), std::move(found));
    line_meter::config config = as_measured;
    config.grid = off.grid(as_measured.grid.every_s, as_measured.grid.window_s);
    config.response = off.meter(config.grid).response;
    config.hold_frequency = true;
    line_meter meter{config};
    off.chain->listen(meter);
    const pass_report pass = run(off, running, program);
    if (pass.end == pass_end::stopped) {
        throw stopped_early{};
    }
    if (pass.end == pass_end::input_failed) {
        throw error{fault::unreadable, pass.failure, path, "copy the recording anew"};
    }
    if (!meter.has_records()) {
        throw error{fault::malformed, "holds no whole record of the background", path,
                    "record it for longer than the window, better for half a minute"};
    }
    return {background_of(meter.take_result(), path), doubts_of(off, path)};
}

} // namespace tonewalk::cli
