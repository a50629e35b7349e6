// SPDX-License-Identifier: GPL-3.0-or-later
#include <algorithm>
#include <cmath>
#include <memory>

#include <CLI/CLI.hpp>
#include <fmt/core.h>

#include "measurement.hpp"
#include "tonewalk/base/error.hpp"
#include "tonewalk/detect/audio_loudness.hpp"
#include "tonewalk/detect/audio_path.hpp"
#include "tonewalk/detect/audio_spool.hpp"
#include "tonewalk/meter/audio_quality.hpp"
#include "tonewalk/meter/level_notes.hpp"
#include "tonewalk/report/audio_file.hpp"
#include "tonewalk/report/json_report.hpp"

namespace tonewalk::cli {
namespace {

struct hear_options {
    recording_options recording;
    signal_options signal;
    running_options running;
    json_options json;
    std::string detector = "envelope", output, band, audio_rate = "48000", loudness = "field", gain,
                sample = "pcm16";
};

/// "LOW:HIGH"; either side may be left out.
void read_band(const std::string& text, audio_band_request& request) {
    if (text.empty()) {
        return;
    }
    const std::size_t colon = text.find(':');
    if (colon == std::string::npos || text.size() == 1) {
        throw error{fault::bad_request, "needs a low and a high end", "--band " + text,
                    "write it like 300:3k"};
    }
    if (colon > 0) {
        request.low_hz = parse_hz(text.substr(0, colon), "--band");
    }
    if (colon + 1 < text.size()) {
        request.high_hz = parse_hz(text.substr(colon + 1), "--band");
    }
    check_audio_band(request);
}

double read_audio_rate(const std::string& text) {
    constexpr double lowest_hz = 8000.0, highest_hz = 192000.0;
    const double hz = parse_hz(text, "--audio-rate");
    if (hz < lowest_hz || hz > highest_hz || hz != std::floor(hz)) {
        throw error{fault::bad_request, "has to be a whole number from 8000 to 192000",
                    "--audio-rate " + text, "give a rate such as 48k"};
    }
    return hz;
}

struct audio_choice {
    audio_options options;
    audio_file::config file;
    audio_band_request band;
    detector_kind detector = detector_kind::envelope;
};

audio_choice read_choice(const hear_options& o) {
    audio_choice c;
    c.detector = chosen("--detector", o.detector, {"envelope", "synchronous"}) == 0
                     ? detector_kind::envelope
                     : detector_kind::synchronous;
    c.options.mode = chosen("--loudness", o.loudness, {"field", "steady"}) == 0 ? loudness::field
                                                                                : loudness::steady;
    if (!o.gain.empty()) {
        if (c.options.mode == loudness::steady) {
            throw error{fault::bad_request, "goes with --loudness field only", "--gain " + o.gain,
                        "leave one of them out: steady loudness comes from the carrier"};
        }
        c.options.gain_db = parse_db(o.gain, "--gain");
    }
    c.options.audio_rate_hz = read_audio_rate(o.audio_rate);
    c.file = {.target = o.output,
              .rate_hz = c.options.audio_rate_hz,
              .sample = parse_audio_sample(o.sample, "--sample"),
              .force = o.running.force};
    c.options.clamp = c.file.sample != audio_sample::float32;
    static_cast<void>(audio_container_of(o.output));
    c.band.audio_rate_hz = c.options.audio_rate_hz;
    read_band(o.band, c.band);
    return c;
}

/// The meter's carrier where it was detected.
carrier_curve carrier_of(const level_log& log) {
    std::vector<double> time_s, amplitude;
    for (const level_record& r : log.records) {
        time_s.push_back(r.time_s);
        amplitude.push_back(r.carrier.detected ? std::sqrt(std::max(0.0, r.carrier.power))
                                               : not_measured);
    }
    return {time_s, amplitude};
}

/// Without any record (a recording shorter than a window) there is audio all the same.
level_log log_or_nothing(line_meter& meter, const measurement& m) {
    if (meter.has_records()) {
        return meter.take_result();
    }
    level_log none;
    none.carrier_offset_hz = m.found.offset_hz;
    none.tone_hz = m.found.tone_hz.value_or(not_measured);
    return none;
}

/// Gaps become silence of equal length: days of it are not what anybody wants to hear.
void refuse_endless_silence(const stream_facts& facts) {
    constexpr double most_silence_s = 24.0 * 3600.0;
    const double silence_s = facts.span_s() - facts.duration_s();
    if (silence_s > most_silence_s) {
        throw error{fault::malformed,
                    fmt::format("has gaps of {:.1f} days together, which would all become silence",
                                silence_s / most_silence_s),
                    facts.where(), "give --from and --until for the part to hear"};
    }
}

int run_hear(const hear_options& o, const program& program) {
    audio_choice choice = read_choice(o);
    o.json.check();
    o.running.check();
    output_set outputs{o.running.force};
    outputs.also(o.output);
    std::optional<output_file> json = outputs.open(o.json.json);
    outputs.spare(o.recording.recording);
    audio_file file{choice.file};

    measurement m = open_measurement(o.recording, o.signal, program);
    refuse_endless_silence(m.facts());
    line_meter::config meter_config = m.meter(usual_grid(m));
    meter_config.envelope_in_use = choice.detector == detector_kind::envelope;
    line_meter meter{meter_config};
    choice.band.rate_hz = m.chain->rate_hz();
    choice.band.width_hz = m.found.width_hz;
    const audio_band band = choose_audio_band(choice.band);
    audio_spool spool{std::filesystem::absolute(o.output).parent_path()};
    const double start_s =
        static_cast<double>(m.facts().stretches.front().position) / m.facts().sample_rate_hz;
    audio_path path{{.rate_hz = m.chain->rate_hz(),
                     .width_hz = m.found.width_hz,
                     .detector = choice.detector,
                     .audio_rate_hz = choice.options.audio_rate_hz,
                     .band = band,
                     .start_s = start_s,
                     .settle_samples = m.chain->settle_samples()},
                    spool};
    m.chain->listen(meter);
    const std::unique_ptr<compression_watch> squeezed = watch_compression(m, meter_config.grid);
    m.chain->listen(path);
    const pass_report pass = run(m, o.running, program);
    need_record(pass, meter);
    spool.close();

    level_log log = log_or_nothing(meter, m);
    const quantity used = log.has_tone() ? quantity::tone : quantity::carrier;
    const compression_result compression = squeezed ? squeezed->result() : compression_result{};
    log.doubts.merge(compression.doubts);
    add_level_notes(log, used, {.compressed = compression.compressed, .heard = true});
    const report_context context = context_of(m, pass, program, log, {"hear", o.detector, used});
    choice.options.start_s = start_s;
    choice.options.audio_samples =
        audio_length(context.recordings.front().span_s, choice.options.audio_rate_hz);
    audio_quality_meter quality{{.audio_rate_hz = choice.options.audio_rate_hz,
                                 .audio_samples = choice.options.audio_samples,
                                 .low_hz = band.low_hz,
                                 .high_hz = band.high_hz,
                                 .tone_hz = log.tone_hz}};
    file.expect(choice.options.audio_samples);
    audio_sink* const sinks[] = {&file, &quality};
    const audio_result audio = render_audio(spool, choice.options, carrier_of(log), sinks);
    file.finish();

    sheet result = describe(audio);
    result.add("tone", describe(quality.result()));
    result.join(describe_mending(m));
    result.add(m.found.spectrum);
    if (json) {
        write_json(*json, context, result, {.curves = o.json.with_curves()});
        json->commit();
    }
    tell(context, result, o.running, {.standard_output_taken = outputs.uses_standard_output()});
    return status_of(pass, program);
}

} // namespace

job_action add_hear(CLI::App& app) {
    const auto o = std::make_shared<hear_options>();
    const std::string group = "The audio";
    o->recording.add_to(app);
    o->signal.add_to(app);
    app.add_option("--detector", o->detector, "envelope or synchronous")
        ->type_name("envelope|synchronous")
        ->group("The signal")
        ->capture_default_str();
    app.add_option("-o,--output", o->output, "audio file, .wav or .flac")
        ->type_name("FILE")
        ->required()
        ->group(group);
    app.add_option("--band", o->band, "LOW:HIGH of the audio; by default 50 Hz to half the width")
        ->type_name("LOW:HIGH")
        ->group(group);
    app.add_option("--audio-rate", o->audio_rate, "samples per second, 8000 to 192000")
        ->type_name("HZ")
        ->group(group)
        ->capture_default_str();
    app.add_option("--loudness", o->loudness,
                   "field keeps the fades; steady divides by the carrier")
        ->type_name("field|steady")
        ->group(group)
        ->capture_default_str();
    app.add_option("--gain", o->gain,
                   "dB, positive amplifies; by default the peak stands at -1 dBFS")
        ->type_name("DB")
        ->group(group);
    app.add_option("--sample", o->sample, "pcm16, pcm24 or float")
        ->type_name("pcm16|pcm24|float")
        ->group(group)
        ->capture_default_str();
    o->json.add_to(app);
    o->running.add_to(app);
    return [o](const program& program) { return run_hear(*o, program); };
}

} // namespace tonewalk::cli
