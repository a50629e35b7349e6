// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <string>
#include <utility>
#include <vector>

#include "support/memory_source.hpp"
#include "tonewalk/channel/signal_search.hpp"
#include "tonewalk/scene/generator.hpp"

namespace tonewalk::test {

/// A scene as a recording in memory, as if read from a file.
inline memory_source source_of(const scene& s) {
    stream_facts facts;
    facts.name = "scene";
    facts.format = s.format;
    facts.format_name = "scene";
    facts.sample_rate_hz = s.rate_hz;
    facts.centre_hz = s.centre_hz;
    for (const scene_stretch& part : scene_layout(s)) {
        facts.stretches.push_back({.first = part.first,
                                   .count = part.count,
                                   .position = part.position,
                                   .centre_hz = part.centre_hz});
    }
    return memory_source{std::move(facts), render_bytes(s)};
}

inline found_signal search(const scene& s, const search_request& request = {}) {
    memory_source source = source_of(s);
    return find_signal(source, request);
}

/// 48 kS/s, cf32, 2 s, noise 60 dB below a carrier of -20 dBFS in 20 kHz.
inline scene quiet_scene(std::vector<scene_carrier> carriers) {
    scene s;
    s.format = parse_sample_format("cf32_le").value();
    s.duration_s = 2.0;
    s.carriers = std::move(carriers);
    s.receiver.noise_dbfs_hz = -123.0;
    return s;
}

inline scene_carrier modulated(double offset_hz, double level_dbfs = -20.0, double tone_hz = 1000.0,
                               double depth_percent = 30.0) {
    scene_carrier c;
    c.offset_hz = offset_hz;
    c.level_dbfs = level_dbfs;
    c.tones.push_back({.frequency_hz = tone_hz, .depth_percent = depth_percent});
    return c;
}

inline scene_carrier pure(double offset_hz, double level_dbfs = -20.0) {
    scene_carrier c;
    c.offset_hz = offset_hz;
    c.level_dbfs = level_dbfs;
    return c;
}

inline bool has(const found_signal& f, note_code code) {
    return f.notes.has(code);
}

inline std::string text_of(const found_signal& f, note_code code) {
    for (const note& each : f.notes.all()) {
        if (each.code == code) {
            return each.text + "; " + each.advice;
        }
    }
    return "(no such note)";
}

} // namespace tonewalk::test
