// SPDX-License-Identifier: GPL-3.0-or-later
#include <array>
#include <memory>

#include <CLI/CLI.hpp>
#include <fmt/core.h>

#include "background_run.hpp"
#include "measurement.hpp"
#include "tonewalk/base/error.hpp"
#include "tonewalk/detect/detector.hpp"
#include "tonewalk/meter/level_notes.hpp"
#include "tonewalk/meter/reference_drift.hpp"
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
    std::string detector = "none", quantity, every = "100ms", window = "200ms", background, csv;
    std::vector<std::string> references;
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

/// The options, read and judged before any file is opened.
struct levels_choice {
    double every_s = 0.0, window_s = 0.0;
    std::optional<detector_kind> detector;
    std::optional<quantity> wanted;
    std::vector<moment_span> references; ///< none or two
};

std::vector<moment_span> read_references(const std::vector<std::string>& texts) {
    if (!texts.empty() && texts.size() != 2) {
        throw error{fault::bad_request,
                    texts.size() == 1 ? std::string{"is given once"}
                                      : fmt::format("is given {} times", texts.size()),
                    "--reference", "give it twice: one before and one after the walk"};
    }
    std::vector<moment_span> spans;
    spans.reserve(texts.size());
    for (const std::string& text : texts) {
        spans.push_back(parse_span(text, "--reference"));
    }
    return spans;
}

levels_choice read_choice(const levels_options& o) {
    levels_choice c;
    c.every_s = positive_seconds(o.every, "--every");
    c.window_s = positive_seconds(o.window, "--window");
    constexpr double most_overlap = 100.0;
    if (c.every_s * most_overlap < c.window_s) {
        throw error{fault::bad_request, "is less than a hundredth of the window",
                    "--every " + o.every, "give a longer one, or a shorter --window"};
    }
    c.detector = chosen_detector(o.detector);
    c.wanted = wanted_quantity(o.quantity);
    c.references = read_references(o.references);
    if (!o.background.empty() && o.recording.recording == "-") {
        throw error{fault::bad_request, "cannot be measured while standard input waits",
                    "--background " + o.background,
                    "write the recording to a file first, and give that"};
    }
    if (o.background == "-") {
        throw error{fault::bad_request, "cannot be standard input", "--background -",
                    "give a recording in a file"};
    }
    return c;
}

/// Where the references lie in the recording that is open.
std::array<reference_span, 2> placed(const std::vector<moment_span>& spans,
                                     const std::vector<std::string>& texts,
                                     const stream_facts& facts) {
    std::array<reference_span, 2> out;
    for (std::size_t k = 0; k < 2; ++k) {
        out[k] = {seconds_into(facts, spans[k].from, "--reference"),
                  seconds_into(facts, spans[k].until, "--reference")};
        const bool ascends = out[k].from_s < out[k].until_s;
        if (!ascends || (k > 0 && out[k].from_s < out[k - 1].until_s)) {
            throw error{fault::bad_request,
                        ascends ? "begins before the first one ends" : "ends before it begins",
                        "--reference " + texts[k], "give the earlier moment first"};
        }
    }
    return out;
}

/// Peaks and nulls, summary and everything else that the log gives.
sheet result_of(level_log& log, quantity used, const found_signal& found) {
    const extrema_result extrema = find_extrema(log, used);
    log.doubts.merge(extrema.doubts);
    sheet result = describe(log);
    result.add(describe(extrema));
    result.add("summary", describe(summarise(log, used)));
    result.add(found.spectrum);
    return result;
}

int run_levels(const levels_options& o, const program& program) {
    const levels_choice choice = read_choice(o);
    o.json.check();
    o.running.check();
    output_set outputs{o.running.force};
    std::optional<output_file> csv = outputs.open(o.csv), json = outputs.open(o.json.json);
    outputs.spare(o.recording.recording);
    outputs.spare(o.background);

    measurement m = open_measurement(o.recording, o.signal, program);
    const quantity used = chosen_quantity(choice.wanted, m.found.tone_hz.has_value());
    std::optional<std::array<reference_span, 2>> references;
    if (!choice.references.empty()) {
        references = placed(choice.references, o.references, m.facts());
    }
    const record_grid grid = m.grid(choice.every_s, choice.window_s);
    line_meter::config meter_config = m.meter(grid);
    meter_config.envelope_in_use = choice.detector == detector_kind::envelope;
    background_run background;
    if (!o.background.empty()) {
        background = run_background(o.background, o.recording, m, meter_config, o.running, program);
        meter_config.background = background.lines;
    }
    line_meter meter{meter_config};
    m.chain->listen(meter);
    const std::unique_ptr<compression_watch> squeezed = watch_compression(m, grid);
    std::unique_ptr<tone_reading> reading;
    if (choice.detector && m.found.tone_hz) {
        reading = std::make_unique<tone_reading>(
            tone_reading::config{.detector = *choice.detector,
                                 .width_hz = m.found.width_hz,
                                 .grid = grid,
                                 .tone_hz = *m.found.tone_hz,
                                 .response = m.chain->response(*m.found.tone_hz)});
        m.chain->listen(*reading);
    }
    const pass_report pass = run(m, o.running, program);
    need_record(pass, meter);

    level_log log = meter.take_result();
    if (reading) {
        log.detector_tone_dbfs = reading->tone_dbfs(log.tone_hz);
        log.detector_column = reading->column_key();
    }
    const compression_result compression = squeezed ? squeezed->result() : compression_result{};
    log.doubts.merge(compression.doubts);
    add_level_notes(log, used, {.compressed = compression.compressed});
    log.doubts.merge(background.doubts);
    add_background_note(log, used);
    std::optional<reference_drift> drift;
    if (references) {
        drift = remove_drift(log, *references);
    }
    sheet result = result_of(log, used, m.found);
    result.join(describe_mending(m));
    if (drift) {
        result.add("reference", describe(*drift));
    }
    if (!o.background.empty()) {
        result.add("background", describe(background.lines));
    }
    const report_context context = context_of(
        m, pass, program, log, {"levels", choice.detector ? o.detector : std::string{}, used});
    if (csv) {
        write_csv(*csv, *find_table(result, "log"));
        csv->commit();
    }
    if (json) {
        write_json(*json, context, result, {.curves = o.json.with_curves()});
        json->commit();
    }
    tell(context, result, o.running,
         {.standard_output_taken = outputs.uses_standard_output(),
          .plot_column = used == quantity::tone ? "tone_dbfs" : "carrier_dbfs"});
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
    app.add_option("--reference", o->references,
                   "FROM:UNTIL of a steady reference, given twice, before and after: what drifted "
                   "meanwhile is taken off")
        ->type_name("FROM:UNTIL")
        ->allow_extra_args(false)
        ->group("Corrections");
    app.add_option("--background", o->background,
                   "recording with the transmitter off: what stands there is taken off in power")
        ->type_name("FILE")
        ->group("Corrections");
    app.add_option("--csv", o->csv, "the level log as CSV; - is standard output")
        ->type_name("FILE")
        ->group("Outputs");
    o->json.add_to(app);
    o->running.add_to(app);
    return [o](const program& program) { return run_levels(*o, program); };
}

} // namespace tonewalk::cli
