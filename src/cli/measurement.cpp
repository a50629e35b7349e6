// SPDX-License-Identifier: GPL-3.0-or-later
#include "measurement.hpp"

#include <cstdio>
#include <cstdlib>

#include <fmt/core.h>
#include <sys/ioctl.h>
#include <unistd.h>

#include "print_out.hpp"
#include "tonewalk/base/error.hpp"
#include "tonewalk/report/text_report.hpp"

namespace tonewalk::cli {
namespace {

constexpr int input_failed_status = 3;

int screen_columns(int descriptor) {
    constexpr int usual = 80, least = 40;
    winsize size{};
    if (ioctl(descriptor, TIOCGWINSZ, &size) == 0 && size.ws_col > 0) {
        return std::max<int>(least, size.ws_col);
    }
    return usual;
}

/// Where nobody can be told of a failure any more.
void print_error(const std::string& text) {
    std::fputs(text.c_str(), stderr);
    std::fflush(stderr);
}

/// Looks for the signal; a stop ends the wait for a pipe's opening.
found_signal find_unless_stopped(block_source& source, const search_request& request,
                                 const std::stop_token& stop) {
    const std::stop_callback wake{stop, [&source] { source.wake(); }};
    try {
        found_signal found = find_signal(source, request);
        if (!stop.stop_requested()) {
            return found;
        }
    } catch (const error&) { // a cut opening holds too little, or nothing
        if (!stop.stop_requested()) {
            throw;
        }
    }
    throw stopped_early{};
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

measurement open_measurement(const recording_options& recording, const signal_options& signal,
                             const program& program) {
    const search_request request{
        .carrier = signal.carrier_hz(), .tone_hz = signal.tone_hz(), .width_hz = signal.width_hz()};
    std::unique_ptr<block_source> source = open_recording(recording.request());
    found_signal found = find_unless_stopped(*source, request, program.stopping.token());
    const stream_facts& facts = source->facts();
    auto front = front_end::make(facts, {&found.plan, 1});
    auto chain = std::make_unique<channel_chain>(*front, 0, found.plan, facts);
    return {std::move(source), std::move(found), std::move(front), std::move(chain),
            raw_watch{facts}};
}

pass_report run(measurement& m, const running_options& options, const program& program) {
    progress_line progress{options.progress_shown(), m.facts().sample_rate_hz};
    chain* const chains[] = {m.chain.get()};
    return run_pass(*m.source, *m.front, chains, m.watch,
                    {.stop = program.stopping.token(),
                     .progress = &progress,
                     .threads = options.thread_count()});
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

report_context context_of(const measurement& m, const pass_report& pass, const program& program,
                          const level_log& log, std::string job, std::string detector,
                          quantity used) {
    report_context c;
    c.version = TONEWALK_VERSION;
    c.command = program.command;
    c.job = std::move(job);
    const bool partial = pass.end != pass_end::complete;
    c.recordings.push_back(summarise(m.facts(), pass.samples, partial));
    sheet signal;
    const auto& centre_hz = m.facts().centre_hz;
    signal.add("carrier_hz", "Hz", centre_hz ? cell{*centre_hz + log.carrier_offset_hz} : cell{});
    signal.add("carrier_offset_hz", "Hz", log.carrier_offset_hz);
    signal.add("tone_hz", "Hz", log.tone_hz);
    signal.add("channel_width_hz", "Hz", m.found.width_hz);
    signal.add("detector", "", detector.empty() ? cell{} : cell{std::move(detector)});
    signal.add("quantity", "", std::string{used == quantity::tone ? "tone" : "carrier"});
    c.signal = std::move(signal);
    c.notes.merge(m.facts().notes);
    if (!centre_hz) {
        c.notes.add({note_code::centre_unknown, severity::info,
                     "the recording's centre frequency is not known",
                     "carrier_hz is null; give --centre"});
    }
    c.notes.merge(m.found.notes);
    c.notes.merge(m.watch.result().doubts);
    c.notes.merge(log.doubts);
    if (partial) {
        c.notes.add({note_code::partial, severity::warning,
                     pass.end == pass_end::stopped
                         ? "stopped before the recording's end"
                         : "the recording could not be read to its end: " + pass.failure,
                     "figures hold for the part that was measured"});
    }
    return c;
}

std::optional<output_file> output_set::open(const std::string& path) {
    if (path.empty()) {
        return std::nullopt;
    }
    also(path);
    check();
    standard_output_ = standard_output_ || path == "-";
    return output_file{path, force_};
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
          bool standard_output_taken, std::string plot_column) {
    std::FILE* const stream = standard_output_taken ? stderr : stdout;
    const bool colour = isatty(fileno(stream)) != 0 && std::getenv("NO_COLOR") == nullptr;
    const text_report_options how{.columns = screen_columns(fileno(stream)),
                                  .colour = colour,
                                  .info_notes = !options.quiet,
                                  .plot_column = std::move(plot_column)};
    const std::string summary = summary_text(context, result, how);
    standard_output_taken ? print_error(summary) : print_out(summary);
    text_report_options for_notes = how;
    for_notes.columns = screen_columns(STDERR_FILENO);
    for_notes.colour = isatty(STDERR_FILENO) != 0 && std::getenv("NO_COLOR") == nullptr;
    print_error(notes_text(context.notes, for_notes));
    if (!options.quiet) {
        print_error(cautions_text(context.cautions, for_notes));
    }
}

} // namespace tonewalk::cli
