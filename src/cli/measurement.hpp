// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <filesystem>
#include <memory>
#include <optional>
#include <string>
#include <vector>

#include "jobs.hpp"
#include "options.hpp"
#include "tonewalk/base/error.hpp"
#include "tonewalk/base/output_file.hpp"
#include "tonewalk/channel/channel_chain.hpp"
#include "tonewalk/channel/signal_search.hpp"
#include "tonewalk/meter/compression_watch.hpp"
#include "tonewalk/meter/line_meter.hpp"
#include "tonewalk/meter/raw_watch.hpp"
#include "tonewalk/pass/run_pass.hpp"
#include "tonewalk/report/report_context.hpp"

namespace tonewalk::cli {

/// A recording that is open, the signal that was found in it, and the chain that takes it out.
struct measurement {
    std::unique_ptr<block_source> source;
    found_signal found;
    std::unique_ptr<const front_end> front;
    std::unique_ptr<channel_chain> chain;
    raw_watch watch;

    [[nodiscard]] const stream_facts& facts() const noexcept { return source->facts(); }
    [[nodiscard]] record_grid grid(double every_s, double window_s) const noexcept;
    [[nodiscard]] line_meter::config meter(const record_grid&) const;
};
/// The channel of a signal that is known already, in the recording that is open.
[[nodiscard]] measurement measurement_of(std::unique_ptr<block_source>, found_signal);

/// For raw samples alone: no channel.
[[nodiscard]] measurement measurement_of(std::unique_ptr<block_source>);

/// What `find` gives. A stop ends its wait for a pipe's opening; then it is given what came of it,
/// and where that is too little throws stopped_early.
template <class Find>
[[nodiscard]] auto unless_stopped(block_source& source, const program& program, Find find) {
    const std::stop_token stop = program.stopping.token();
    const std::stop_callback wake{stop, [&source] { source.wake(); }};
    program.stopping.hold_results();
    try {
        return find();
    } catch (const error&) { // a cut opening holds too little, or nothing
        if (!stop.stop_requested()) {
            throw;
        }
    }
    throw stopped_early{};
}

/// Throws stopped_early when a signal comes before there is anything to measure.
[[nodiscard]] measurement open_measurement(const recording_options&, const signal_options&,
                                           const program&);

/// A window long enough for the tone, for jobs whose windows nobody chooses.
[[nodiscard]] record_grid usual_grid(const measurement&);

/// Listens for a receiver that squeezes the tone; nothing without a tone.
[[nodiscard]] std::unique_ptr<compression_watch> watch_compression(measurement&,
                                                                   const record_grid&);

/// Runs the pass; input that failed halfway gives a partial result. Throws stopped_early where a
/// stop left nothing measured.
[[nodiscard]] pass_report run(measurement&, const running_options&, const program&);

/// Throws stopped_early where a stop came before the first record.
void need_record(const pass_report&, const line_meter&);

/// How a pass ended, as an exit status: 0, 3 where input failed, 130 or 143 where it was stopped.
[[nodiscard]] int status_of(const pass_report&, const program&);

/// iq_gain_error_db and iq_phase_error_deg of what --mend-iq took out; empty where it did not.
[[nodiscard]] sheet describe_mending(const measurement&);

/// What every report says beside its result: the recording, and what it and the pass give reason to
/// note.
[[nodiscard]] report_context context_of(const stream_facts&, const pass_report&, const program&,
                                        std::string job);

/// What a report calls the signal that was measured.
struct signal_words {
    std::string job, detector; ///< detector: empty for none
    quantity used = quantity::tone;
};
/// The same with the signal, and with all notes that finding and measuring it gave.
[[nodiscard]] report_context context_of(const measurement&, const pass_report&, const program&,
                                        const level_log&, const signal_words&);

/// The outputs of a job, opened (and so checked) before measuring.
class output_set {
public:
    explicit output_set(bool force) : force_{force} {}
    /// Nothing for an empty path.
    [[nodiscard]] std::optional<output_file> open(const std::string& path);
    void
    also(const std::filesystem::path&); ///< written by other means, but no two outputs may meet
    /// Refuses an output that is the recording itself, --force or not: error{bad_request}.
    void spare(const std::string& recording) const;
    void check() const { check_distinct_outputs(paths_); }
    [[nodiscard]] bool uses_standard_output() const noexcept { return standard_output_; }

private:
    bool force_, standard_output_ = false;
    std::vector<std::filesystem::path> paths_;
};

/// How people are told.
struct telling {
    bool standard_output_taken = false; ///< it carries a result
    std::string plot_column{};          ///< of the log; empty: no plot
    bool verdict_first = false;         ///< warnings before the figures
};
/// Summary, notes and cautions for people: the summary on standard output, or on standard error
/// where that is taken; notes on standard error.
void tell(const report_context&, const sheet& result, const running_options&, const telling&);

} // namespace tonewalk::cli
