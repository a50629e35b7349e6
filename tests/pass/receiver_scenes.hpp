// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <algorithm>
#include <cmath>
#include <cstdint>
#include <numbers>
#include <optional>
#include <span>
#include <utility>
#include <vector>

#include "pass_support.hpp"
#include "tonewalk/base/random.hpp"
#include "tonewalk/channel/signal_search.hpp"
#include "tonewalk/maths/quantile.hpp"
#include "tonewalk/meter/compression_watch.hpp"
#include "tonewalk/meter/gain_control.hpp"
#include "tonewalk/meter/line_meter.hpp"
#include "tonewalk/scene/generator.hpp"
#include "tonewalk/scene/truth.hpp"

namespace tonewalk::test {

inline constexpr double scene_rate_hz = 8000.0;
inline constexpr double scene_centre_hz = 145e6;

/// What a scene is drawn from; every value is as likely as any other between its ends.
struct scene_ranges {
    double seconds = 20.0;
    double fade_db = 20.0;                             ///< from peak to null
    double seen_db = 0.0;                              ///< of it, at least, in the time recorded
    double least_fade_s = 3.0, most_fade_s = 20.0;     ///< from one peak to the next
    double weakest_dbhz = 50.0, strongest_dbhz = 90.0; ///< carrier to noise density at peaks
    double least_depth_percent = 20.0, most_depth_percent = 90.0;
};

/// Walks through a sum of two or three waves, whose peak is 1 and whose null lies `fade_db` below.
inline void add_fading(scene& s, random_stream& random, const scene_ranges& ranges) {
    constexpr double degrees = 180.0 / std::numbers::pi;
    const double null = std::pow(10.0, -ranges.fade_db / 20.0);
    const double others = 0.5 * (1.0 - null); // together; they can leave the first one `null`
    const double first_share = random.uniform() < 0.5 ? 1.0 : random.uniform(0.5, 0.9);
    scene_carrier& carrier = s.carriers.front();
    carrier.waves = {{.amplitude = 1.0 - others, .phase_deg = random.uniform(0.0, 360.0)}};
    const double cosine = random.uniform(-1.0, 0.3); // of the second against the walk
    for (const double share : {first_share, 1.0 - first_share}) {
        if (share > 0.0) {
            const double own = share == first_share ? cosine : random.uniform(-1.0, 0.8);
            carrier.waves.push_back({.amplitude = others * share,
                                     .phase_deg = random.uniform(0.0, 360.0),
                                     .direction_deg = std::acos(own) * degrees});
        }
    }
    constexpr double light_m_s = 299'792'458.0;
    const double fade_s = random.uniform(ranges.least_fade_s, ranges.most_fade_s);
    s.path.speed_m_s = light_m_s / scene_centre_hz / (1.0 - cosine) / fade_s;
}

/// Level of the unmodulated carrier below which it stays for this share of the time.
inline double level_quantile_dbfs(const scene& s, double share) {
    constexpr double every_s = 0.05;
    const scene_truth truth{s};
    std::vector<double> amplitudes;
    for (double t = 0.0; t < s.duration_s; t += every_s) {
        amplitudes.push_back(truth.at(0, t).carrier_amplitude);
    }
    return 20.0 * std::log10(quantile(std::move(amplitudes), share));
}

inline double fade_seen_db(const scene& s) {
    return level_quantile_dbfs(s, 1.0) - level_quantile_dbfs(s, 0.0);
}

/// A fading carrier with a tone in noise, 16-bit or float.
inline scene random_scene(random_stream& random, const scene_ranges& ranges) {
    scene s;
    s.format = parse_sample_format(random.uniform() < 0.5 ? "ci16_le" : "cf32_le").value();
    s.rate_hz = scene_rate_hz;
    s.centre_hz = scene_centre_hz;
    s.duration_s = ranges.seconds;
    s.seed = random.next() >> 1U;
    scene_carrier carrier;
    carrier.level_dbfs = random.uniform(-30.0, -8.0);
    carrier.offset_hz = random.uniform(-1500.0, 1500.0);
    carrier.phase_deg = random.uniform(0.0, 360.0);
    carrier.tones = {
        {.frequency_hz = random.uniform(300.0, 700.0),
         .depth_percent = random.uniform(ranges.least_depth_percent, ranges.most_depth_percent),
         .phase_deg = random.uniform(0.0, 360.0)}};
    s.receiver.noise_dbfs_hz =
        carrier.level_dbfs - random.uniform(ranges.weakest_dbhz, ranges.strongest_dbhz);
    s.carriers = {carrier};
    do {
        add_fading(s, random, ranges);
    } while (fade_seen_db(s) < ranges.seen_db);
    return s;
}

/// Level that this share of the samples keeps with both I and Q.
inline double component_quantile_dbfs(const scene& s, double share) {
    std::vector<double> larger;
    for (const cf64& z : render_samples(s)) {
        larger.push_back(std::max(std::abs(z.real()), std::abs(z.imag())));
    }
    return 20.0 * std::log10(quantile(std::move(larger), share));
}

inline memory_source stored(const scene& s) {
    const auto samples = static_cast<std::size_t>(stored_samples(s));
    stream_facts facts = facts_of(s.format.name(), s.rate_hz, samples);
    facts.centre_hz = facts.stretches.front().centre_hz = s.centre_hz;
    return {std::move(facts), render_bytes(s)};
}

/// What the raw samples alone say.
inline note_set raw_notes_of(const scene& s) {
    memory_source source = stored(s);
    raw_watch watch{source.facts()};
    const auto front = front_end::make(source.facts(), {});
    run_pass(source, *front, {}, watch, {});
    return watch.result().doubts;
}

/// Searched, taken out and measured as the program does it.
inline note_set notes_of(const scene& s) {
    memory_source source = stored(s);
    const search_request request{.carrier = signed_hz{s.carriers.front().offset_hz, true},
                                 .tone_hz = s.carriers.front().tones.front().frequency_hz};
    const found_signal found = find_signal(source, request);
    const auto front = front_end::make(source.facts(), {&found.plan, 1});
    channel_chain channel{*front, 0, found.plan, source.facts()};
    line_meter::config c;
    c.grid = {.rate_hz = channel.rate_hz(), .settle_samples = channel.settle_samples()};
    c.carrier_offset_hz = found.offset_hz;
    c.tone_hz = found.tone_hz;
    c.width_hz = found.width_hz;
    c.noise_bandwidth_hz = channel.noise_bandwidth_hz();
    c.response = [&channel](double hz) { return channel.response(hz); };
    line_meter meter{c};
    channel.listen(meter);
    std::optional<compression_watch> compression;
    if (found.tone_hz) {
        compression.emplace(compression_watch::config{.rate_hz = channel.rate_hz(),
                                                      .tone_hz = *found.tone_hz,
                                                      .width_hz = found.width_hz,
                                                      .settle_samples = channel.settle_samples()});
        channel.listen(*compression);
    }
    raw_watch watch{source.facts()};
    chain* const chains[] = {&channel};
    run_pass(source, *front, chains, watch, {});
    note_set doubts = watch.result().doubts;
    const compression_result squeeze = compression ? compression->result() : compression_result{};
    doubts.merge(squeeze.doubts);
    doubts.merge(judge_gain_control(meter.take_result(), squeeze.compressed).doubts);
    return doubts;
}

} // namespace tonewalk::test
