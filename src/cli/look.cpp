// SPDX-License-Identifier: GPL-3.0-or-later
#include <memory>

#include <CLI/CLI.hpp>
#include <fmt/core.h>

#include "measurement.hpp"
#include "tonewalk/channel/recording_survey.hpp"
#include "tonewalk/meter/gain_control.hpp"
#include "tonewalk/recording/segment_list.hpp"
#include "tonewalk/recording/verify.hpp"
#include "tonewalk/report/json_report.hpp"

namespace tonewalk::cli {
namespace {

struct look_options {
    recording_options recording;
    running_options running;
    json_options json;
};

/// The recording, and what its hash says; a mismatch is a doubt here, not a refusal.
struct opened {
    std::unique_ptr<block_source> source;
    std::string sha512;
    note_set notes;
};

opened open_with_hash(recording_request request) {
    opened o;
    if (request.verify) {
        const data_hash hash = hash_data(request);
        request.verify = false;
        o.sha512 = hash.found;
        if (hash.differs()) {
            o.notes.add({note_code::hash_mismatch, severity::warning,
                         fmt::format("the samples have the SHA-512 {:.16}..., the recording states "
                                     "{:.16}...",
                                     hash.found, hash.stated),
                         "the file was changed or damaged on its way: copy it anew"});
        }
    }
    o.source = open_recording(request);
    return o;
}

/// Level log and compression of the best carrier, to tell how the receiver's gain behaved.
class gain_witness {
public:
    explicit gain_witness(measurement& m) : meter_{m.meter(usual_grid(m))} {
        m.chain->listen(meter_);
        compression_ = watch_compression(m, usual_grid(m));
    }

    /// gain_control and compression; notes of both.
    [[nodiscard]] sheet result(note_set& notes) {
        const compression_result compression =
            compression_ ? compression_->result() : compression_result{};
        const level_log log = meter_.has_records() ? meter_.take_result() : level_log{};
        const gain_control_result gain = judge_gain_control(log, compression.compressed);
        notes.merge(gain.doubts);
        notes.merge(compression.doubts);
        sheet s;
        s.add("gain_control", describe(gain));
        if (compression_) {
            s.add("compression", describe(compression));
        }
        if (!log.records.empty()) {
            s.add(log.strip);
        }
        return s;
    }

private:
    line_meter meter_;
    std::unique_ptr<compression_watch> compression_;
};

/// What a pass over the whole recording showed.
struct whole_view {
    pass_report pass;
    raw_result raw;
    sheet gain;
    note_set notes;
};

whole_view watch_all(std::unique_ptr<block_source>& source, const recording_survey& survey,
                     const running_options& running, const program& program) {
    measurement m = survey.best ? measurement_of(std::move(source), *survey.best)
                                : measurement_of(std::move(source));
    whole_view view;
    std::optional<gain_witness> witness;
    if (survey.best) {
        witness.emplace(m);
    }
    view.pass = run(m, running, program);
    view.raw = m.watch.result();
    view.notes.merge(view.raw.doubts);
    if (witness) {
        view.gain = witness->result(view.notes);
    } else {
        view.gain.add("gain_control", describe(judge_gain_control({})));
    }
    source = std::move(m.source);
    return view;
}

int run_look(const look_options& o, const program& program) {
    o.json.check();
    o.running.check();
    output_set outputs{o.running.force};
    std::optional<output_file> json = outputs.open(o.json.json);
    outputs.spare(o.recording.recording);

    opened open = open_with_hash(o.recording.request());
    const recording_survey survey = unless_stopped(*open.source, program, [&] {
        return survey_recording(*open.source, {}, program.stopping.token());
    });
    const whole_view view = watch_all(open.source, survey, o.running, program);
    const stream_facts& facts = open.source->facts();

    sheet result = describe(view.raw);
    result.join(describe(survey, facts));
    result.join(view.gain);
    result.join(describe_segments(facts, view.pass.samples));
    report_context context = context_of(facts, view.pass, program, "look");
    context.recordings.front().sha512 = open.sha512;
    context.notes.merge(open.notes);
    context.notes.merge(survey.notes);
    if (survey.carriers.empty()) {
        context.notes.add({note_code::weak_carrier, severity::warning,
                           "no carrier stands out of the noise where the recording was looked at",
                           "name its frequency to levels or hear if it is known; else check "
                           "antenna, gain and frequency"});
    }
    context.notes.merge(view.notes);
    if (json) {
        write_json(*json, context, result, {.curves = o.json.with_curves()});
        json->commit();
    }
    tell(context, result, o.running,
         {.standard_output_taken = outputs.uses_standard_output(), .verdict_first = true});
    return status_of(view.pass, program);
}

} // namespace

job_action add_look(CLI::App& app) {
    const auto o = std::make_shared<look_options>();
    o->recording.add_to(app);
    o->json.add_to(app);
    o->running.add_to(app);
    return [o](const program& program) { return run_look(*o, program); };
}

} // namespace tonewalk::cli
