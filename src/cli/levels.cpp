// SPDX-License-Identifier: GPL-3.0-or-later
#include <memory>

#include <CLI/CLI.hpp>

#include "measurement.hpp"
#include "tonewalk/base/error.hpp"
#include "tonewalk/detect/detector.hpp"
#include "tonewalk/meter/level_notes.hpp"
#include "tonewalk/meter/tone_reading.hpp"
#include "tonewalk/reading/extrema.hpp"
#include "tonewalk/report/csv_report.hpp"
#include "tonewalk/report/json_report.hpp"

namespace tonewalk::cli {
namespace {

struct levels_options {
    recording_options recording;
    signal_options signal;
    running_options running;
    json_options json;
    std::string detector = "none", quantity, every = "100ms", window = "200ms", csv;
};

double positive_seconds(const std::string& text, const char* option) {
    const double seconds = parse_seconds(text, option);
    if (seconds <= 0.0) {
        throw error{fault::bad_request, "has to be above 0", std::string{option} + " " + text,
                    "give a time such as 200ms"};
    }
    return seconds;
}

/// Nothing: the tone where there is one.
std::optional<quantity> wanted_quantity(const std::string& text) {
    if (text.empty()) {
        return std::nullopt;
    }
    return chosen("--quantity", text, {"tone", "carrier"}) == 0 ? quantity::tone
                                                                : quantity::carrier;
}

quantity chosen_quantity(std::optional<quantity> wanted, bool has_tone) {
    if (!wanted) {
        return has_tone ? quantity::tone : quantity::carrier;
    }
    if (wanted == quantity::tone && !has_tone) {
        throw error{fault::malformed, "cannot be used: no steady tone was found", "--quantity tone",
                    "give --tone, or --quantity carrier"};
    }
    return *wanted;
}

std::optional<detector_kind> chosen_detector(const std::string& text) {
    switch (chosen("--detector", text, {"none", "envelope", "synchronous"})) {
    case 0:
        return std::nullopt;
    case 1:
        return detector_kind::envelope;
    default:
        return detector_kind::synchronous;
    }
}

int run_levels(const levels_options& o, const program& program) {
    const double every_s = positive_seconds(o.every, "--every");
    const double window_s = positive_seconds(o.window, "--window");
    constexpr double most_overlap = 100.0;
    if (every_s * most_overlap < window_s) {
        throw error{fault::bad_request, "is less than a hundredth of the window",
                    "--every " + o.every, "give a longer one, or a shorter --window"};
    }
    const std::optional<detector_kind> kind = chosen_detector(o.detector);
    const std::optional<quantity> wanted = wanted_quantity(o.quantity);
    o.json.check();
    o.running.check();
    output_set outputs{o.running.force};
    std::optional<output_file> csv = outputs.open(o.csv), json = outputs.open(o.json.json);
    outputs.spare(o.recording.recording);

    measurement m = open_measurement(o.recording, o.signal, program);
    const quantity used = chosen_quantity(wanted, m.found.tone_hz.has_value());
    const record_grid grid = m.grid(every_s, window_s);
    line_meter::config meter_config = m.meter(grid);
    meter_config.envelope_in_use = kind == detector_kind::envelope;
    line_meter meter{meter_config};
    m.chain->listen(meter);
    std::unique_ptr<tone_reading> reading;
    if (kind && m.found.tone_hz) {
        reading = std::make_unique<tone_reading>(
            tone_reading::config{.detector = *kind,
                                 .width_hz = m.found.width_hz,
                                 .grid = grid,
                                 .tone_hz = *m.found.tone_hz,
                                 .response = m.chain->response(*m.found.tone_hz)});
        m.chain->listen(*reading);
    }
    const pass_report pass = run(m, o.running, program);

    level_log log = meter.take_result();
    if (reading) {
        log.detector_tone_dbfs = reading->tone_dbfs(log.tone_hz);
        log.detector_column = reading->column_key();
    }
    add_level_notes(log, used);
    const extrema_result extrema = find_extrema(log, used);
    log.doubts.merge(extrema.doubts);

    sheet result = describe(log);
    result.add(describe(extrema));
    result.add("summary", describe(summarise(log, used)));
    result.add(m.found.spectrum);
    const report_context context =
        context_of(m, pass, program, log, "levels", kind ? o.detector : std::string{}, used);
    if (csv) {
        write_csv(*csv, *find_table(result, "log"));
        csv->commit();
    }
    if (json) {
        write_json(*json, context, result, {.curves = o.json.with_curves()});
        json->commit();
    }
    tell(context, result, o.running, outputs.uses_standard_output(),
         used == quantity::tone ? "tone_dbfs" : "carrier_dbfs");
    return status_of(pass, program);
}

} // namespace

job_action add_levels(CLI::App& app) {
    const auto o = std::make_shared<levels_options>();
    o->recording.add_to(app);
    o->signal.add_to(app);
    app.add_option("--detector", o->detector,
                   "add the tone as an envelope or a synchronous detector reads it")
        ->type_name("none|envelope|synchronous")
        ->group("The signal")
        ->capture_default_str();
    app.add_option("--quantity", o->quantity,
                   "tone or carrier: what peaks and nulls are taken from; by default the tone "
                   "where there is one")
        ->type_name("tone|carrier")
        ->group("Records");
    app.add_option("--every", o->every, "spacing of records")
        ->type_name("TIME")
        ->group("Records")
        ->capture_default_str();
    app.add_option("--window", o->window, "length of one record")
        ->type_name("TIME")
        ->group("Records")
        ->capture_default_str();
    app.add_option("--csv", o->csv, "the level log as CSV; - is standard output")
        ->type_name("FILE")
        ->group("Outputs");
    o->json.add_to(app);
    o->running.add_to(app);
    return [o](const program& program) { return run_levels(*o, program); };
}

} // namespace tonewalk::cli
