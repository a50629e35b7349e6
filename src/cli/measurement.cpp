// SPDX-License-Identifier: GPL-3.0-or-later
#include "measurement.hpp"

#include <algorithm>
#include <cstdio>

#include <fmt/core.h>
#include <unistd.h>

#include "print_out.hpp"
#include "screen.hpp"
#include "tonewalk/base/error.hpp"
#include "tonewalk/report/text_report.hpp"

namespace tonewalk::cli {
namespace {

constexpr int input_failed_status = 3;

/// Where nobody can be told of a failure any more.
void print_error(const std::string& text) {
    std::fputs(text.c_str(), stderr);
    std::fflush(stderr);
}

bool names_standard_output(const std::string& path) {
    return path == "-" || path == "/dev/stdout" || path == "/dev/fd/1" || path == "/proc/self/fd/1";
}

} // namespace

record_grid measurement::grid(double every_s, double window_s) const noexcept {
    return {.rate_hz = chain->rate_hz(),
            .every_s = every_s,
            .window_s = window_s,
            .settle_samples = chain->settle_samples()};
}

line_meter::config measurement::meter(const record_grid& grid) const {
    line_meter::config c;
    c.grid = grid;
    c.carrier_offset_hz = found.offset_hz;
    c.tone_hz = found.tone_hz;
    c.width_hz = found.width_hz;
    c.noise_bandwidth_hz = chain->noise_bandwidth_hz();
    c.response = [taps = chain.get()](double hz) { return taps->response(hz); };
    c.dc_amplitude = found.dc_amplitude;
    c.image_ratio = found.image_ratio;
    c.start_utc = facts().start_utc;
    return c;
}

measurement measurement_of(std::unique_ptr<block_source> source, found_signal found) {
    const stream_facts& facts = source->facts();
    auto front = front_end::make(facts, {&found.plan, 1}, found.mended);
    auto chain = std::make_unique<channel_chain>(*front, 0, found.plan, facts);
    return {std::move(source), std::move(found), std::move(front), std::move(chain),
            raw_watch{facts}};
}

measurement measurement_of(std::unique_ptr<block_source> source) {
    const stream_facts& facts = source->facts();
    return {std::move(source), {}, front_end::make(facts, {}), nullptr, raw_watch{facts}};
}

measurement open_measurement(const recording_options& recording, const signal_options& signal,
                             const program& program) {
    const search_request request{.carrier = signal.carrier_hz(),
                                 .tone_hz = signal.tone_hz(),
                                 .width_hz = signal.width_hz(),
                                 .mend_iq = signal.mend_iq};
    std::unique_ptr<block_source> source = open_recording(recording.request());
    found_signal found =
        unless_stopped(*source, program, [&] { return find_signal(*source, request); });
    return measurement_of(std::move(source), std::move(found));
}

record_grid usual_grid(const measurement& m) {
    constexpr double every_s = 0.1, window_s = 0.2, tone_cycles = 4.0;
    const double slowest_s = m.found.tone_hz ? tone_cycles / *m.found.tone_hz : 0.0;
    return m.grid(every_s, std::max(window_s, slowest_s));
}

std::unique_ptr<compression_watch> watch_compression(measurement& m, const record_grid& grid) {
    if (!m.found.tone_hz) {
        return nullptr;
    }
    auto watch = std::make_unique<compression_watch>(
        compression_watch::config{.rate_hz = grid.rate_hz,
                                  .tone_hz = *m.found.tone_hz,
                                  .width_hz = m.found.width_hz,
                                  .settle_samples = grid.settle_samples});
    m.chain->listen(*watch);
    return watch;
}

pass_report run(measurement& m, const running_options& options, const program& program) {
    progress_line progress{options.progress_shown(), m.facts().sample_rate_hz};
    chain* const one = m.chain.get();
    run_control control{
        .stop = program.stopping.token(), .progress = &progress, .threads = options.thread_count()};
    const bool cut_opening = control.stop.stop_requested() && !m.facts().seekable;
    if (cut_opening) { // what came of it is measured to its end
        m.source->wake();
        control.stop = {};
    }
    pass_report report = run_pass(*m.source, *m.front, {&one, m.chain ? 1U : 0U}, m.watch, control);
    if (cut_opening && report.end == pass_end::complete) {
        report.end = pass_end::stopped;
    }
    if (report.end == pass_end::stopped && report.samples == 0) {
        throw stopped_early{};
    }
    return report;
}

void need_record(const pass_report& pass, const line_meter& meter) {
    if (pass.end == pass_end::stopped && !meter.has_records()) {
        throw stopped_early{};
    }
}

int status_of(const pass_report& pass, const program& program) {
    switch (pass.end) {
    case pass_end::complete:
        return 0;
    case pass_end::input_failed:
        return input_failed_status;
    case pass_end::stopped:
        break;
    }
    return program.stopping.exit_status();
}

sheet describe_mending(const measurement& m) {
    sheet s;
    if (m.found.mended) {
        s.add("mended", describe(*m.found.mended));
    }
    return s;
}

report_context context_of(const stream_facts& facts, const pass_report& pass,
                          const program& program, std::string job) {
    report_context c;
    c.version = TONEWALK_VERSION;
    c.command = program.command;
    c.job = std::move(job);
    const bool partial = pass.end != pass_end::complete;
    c.recordings.push_back(summarise(facts, pass.samples, partial));
    c.notes.merge(facts.notes);
    if (!facts.centre_hz) {
        c.notes.add({note_code::centre_unknown, severity::info,
                     "the recording's centre frequency is not known",
                     "carrier frequencies are offsets from it; give --centre"});
    }
    if (partial) {
        c.notes.add({note_code::partial, severity::warning,
                     pass.end == pass_end::stopped
                         ? "stopped before the recording's end"
                         : "the recording could not be read to its end: " + pass.failure,
                     "figures hold for the part that was measured"});
    }
    return c;
}

report_context context_of(const measurement& m, const pass_report& pass, const program& program,
                          const level_log& log, const signal_words& words) {
    report_context c = context_of(m.facts(), pass, program, words.job);
    sheet signal;
    const auto& centre_hz = m.facts().centre_hz;
    signal.add("carrier_hz", "Hz", centre_hz ? cell{*centre_hz + log.carrier_offset_hz} : cell{});
    signal.add("carrier_offset_hz", "Hz", log.carrier_offset_hz);
    signal.add("tone_hz", "Hz", log.tone_hz);
    signal.add("channel_width_hz", "Hz", m.found.width_hz);
    signal.add("detector", "", words.detector.empty() ? cell{} : cell{words.detector});
    signal.add("quantity", "", std::string{words.used == quantity::tone ? "tone" : "carrier"});
    c.signal = std::move(signal);
    c.notes.merge(m.found.notes);
    c.notes.merge(m.watch.result().doubts);
    c.notes.merge(log.doubts);
    return c;
}

std::optional<output_file> output_set::open(const std::string& path) {
    if (path.empty()) {
        return std::nullopt;
    }
    const std::string target = names_standard_output(path) ? "-" : path;
    also(target);
    check();
    standard_output_ = standard_output_ || target == "-";
    return output_file{target, force_};
}

void output_set::spare(const std::string& recording) const {
    for (const std::filesystem::path& output : paths_) {
        for (const char* ending : {"", ".sigmf-meta", ".sigmf-data", ".sigmf"}) {
            std::filesystem::path part = recording;
            if (*ending != '\0') { // by its base name, or beside its other half
                part.replace_extension(ending);
            }
            std::error_code unknown;
            if (std::filesystem::equivalent(output, part, unknown)) {
                throw error{fault::bad_request, "is the recording itself", output.string(),
                            "give the output another name"};
            }
        }
    }
}

void output_set::also(const std::filesystem::path& path) {
    paths_.push_back(path);
}

void tell(const report_context& context, const sheet& result, const running_options& options,
          const telling& how_told) {
    std::FILE* const stream = how_told.standard_output_taken ? stderr : stdout;
    const bool colour = shows_colour(fileno(stream));
    const text_report_options how{.columns = screen_columns(fileno(stream)),
                                  .colour = colour,
                                  .info_notes = !options.quiet,
                                  .verdict_first = how_told.verdict_first,
                                  .plot_column = how_told.plot_column};
    const std::string summary = summary_text(context, result, how);
    how_told.standard_output_taken ? print_error(summary) : print_out(summary);
    text_report_options for_notes = how;
    for_notes.columns = screen_columns(STDERR_FILENO);
    for_notes.colour = shows_colour(STDERR_FILENO);
    print_error(notes_text(context.notes, for_notes));
    if (!options.quiet) {
        print_error(cautions_text(context.cautions, for_notes));
    }
}

} // namespace tonewalk::cli
