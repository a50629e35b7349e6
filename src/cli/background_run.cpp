// SPDX-License-Identifier: GPL-3.0-or-later
#include "background_run.hpp"

#include "tonewalk/base/error.hpp"

namespace tonewalk::cli {

background_lines run_background(const std::string& path, recording_options recording,
                                const measurement& on, const line_meter::config& as_measured,
                                const running_options& running, const program& program) {
    recording.recording = path;
    recording.from = recording.until = recording.member = {};
    recording.verify = false;
    measurement off = measurement_of(open_recording(recording.request()), on.found);
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
    return background_of(meter.take_result(), path);
}

} // namespace tonewalk::cli
