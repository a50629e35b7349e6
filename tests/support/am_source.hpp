// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cmath>
#include <complex>
#include <functional>
#include <numbers>
#include <optional>
#include <vector>

#include "tonewalk/base/random.hpp"
#include "tonewalk/meter/line_meter.hpp"

namespace tonewalk::test {

/// Full-carrier AM at baseband from the formula, in double: field(t) A (1 + m cos(wm t + b)) e^(j
/// phase(t)), and complex white noise.
struct am_signal {
    double rate_hz = 24e3;
    double offset_hz = 0.0;
    double carrier_dbfs = -20.0;
    double tone_hz = 1000.0;
    double depth = 0.3;
    double phase = 0.3, tone_phase = 0.7;
    double incidental_phase = 0.0;        ///< rad, of the tone, a quarter turn from the depth
    double noise_density = 0.0;           ///< full scale^2 per Hz
    std::function<double(double)> cycles; ///< carrier's turns at t, beside the offset
    std::function<std::complex<double>(double)> field; ///< what the path makes of it; empty: 1
    std::uint64_t seed = 1;
};

inline std::vector<cf32> generate(const am_signal& s, double seconds, double from_s = 0.0) {
    constexpr double two_pi = 2.0 * std::numbers::pi;
    random_stream random{s.seed};
    const double amplitude = std::pow(10.0, s.carrier_dbfs / 20.0);
    const double noise = std::sqrt(s.noise_density * s.rate_hz / 2.0);
    std::vector<cf32> samples(static_cast<std::size_t>(std::llround(seconds * s.rate_hz)));
    for (std::size_t n = 0; n < samples.size(); ++n) {
        const double t = from_s + static_cast<double>(n) / s.rate_hz;
        const double turns = s.offset_hz * t + (s.cycles ? s.cycles(t) : 0.0);
        const double tone = two_pi * s.tone_hz * t + s.tone_phase;
        std::complex<double> z =
            std::polar(amplitude * (1.0 + s.depth * std::cos(tone)),
                       two_pi * turns + s.phase + s.incidental_phase * std::sin(tone));
        if (s.field) {
            z *= s.field(t);
        }
        if (noise > 0.0) {
            const double re = random.gaussian(), im = random.gaussian();
            z += noise * std::complex<double>{re, im};
        }
        samples[n] = {static_cast<float>(z.real()), static_cast<float>(z.imag())};
    }
    return samples;
}

struct meter_options {
    double every_s = 0.1, window_s = 0.2;
    double width_hz = 0.0; ///< 0: four fifths of a quarter of the rate, as a chain would give
    std::optional<double> tone_hz{}; ///< as the opening gave it; empty: the truth
    bool with_tone = true;
    bool envelope_in_use = false;
    std::size_t cut = 4093; ///< samples a call
};

inline line_meter::config meter_config(const am_signal& s, const meter_options& o) {
    line_meter::config c;
    c.grid = {
        .rate_hz = s.rate_hz, .every_s = o.every_s, .window_s = o.window_s, .settle_samples = 0};
    if (o.with_tone) {
        c.tone_hz = o.tone_hz.value_or(s.tone_hz);
    }
    c.width_hz = o.width_hz > 0.0 ? o.width_hz : s.rate_hz / 4.5;
    c.noise_bandwidth_hz = c.width_hz * 1.25;
    c.envelope_in_use = o.envelope_in_use;
    return c;
}

inline void feed(baseband_sink& meter, std::span<const cf32> samples, std::size_t cut) {
    meter.begin_stretch({});
    for (std::size_t first = 0; first < samples.size(); first += cut) {
        const std::size_t count = std::min(cut, samples.size() - first);
        meter.add({samples.subspan(first, count), static_cast<sample_index>(first), {}});
    }
    meter.end_stretch();
    meter.finish();
}

inline level_log measure(const am_signal& s, double seconds, const meter_options& o) {
    line_meter meter{meter_config(s, o)};
    feed(meter, generate(s, seconds), o.cut);
    return meter.take_result();
}

} // namespace tonewalk::test
