// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <algorithm>
#include <cmath>
#include <complex>
#include <cstddef>
#include <functional>
#include <numbers>
#include <span>
#include <vector>

#include "tonewalk/base/random.hpp"
#include "tonewalk/base/sample.hpp"
#include "tonewalk/channel/chain.hpp"
#include "tonewalk/detect/audio_sink.hpp"
#include "tonewalk/detect/detector.hpp"

namespace tonewalk::test {

inline constexpr double turn = 2.0 * std::numbers::pi;

/// Keeps all audio it is given.
struct kept_audio final : audio_sink {
    void add(std::span<const float> part) override {
        audio.insert(audio.end(), part.begin(), part.end());
    }
    std::vector<float> audio;
};

/// `count` samples of `at(seconds)`.
inline std::vector<cf32> baseband(std::size_t count, double rate_hz,
                                  const std::function<cf64(double)>& at) {
    std::vector<cf32> samples;
    for (std::size_t n = 0; n < count; ++n) {
        const cf64 z = at(static_cast<double>(n) / rate_hz);
        samples.emplace_back(static_cast<float>(z.real()), static_cast<float>(z.imag()));
    }
    return samples;
}

inline std::vector<float> real_tone(std::size_t count, double rate_hz, double hz,
                                    double amplitude) {
    std::vector<float> samples;
    for (std::size_t n = 0; n < count; ++n) {
        samples.push_back(static_cast<float>(
            amplitude *
            std::cos(turn * std::remainder(hz / rate_hz * static_cast<double>(n), 1.0))));
    }
    return samples;
}

/// Complex Gaussian noise, `power` in all.
inline void add_noise(std::span<cf32> samples, double power, std::uint64_t seed) {
    random_stream noise{seed};
    const double sigma = std::sqrt(0.5 * power);
    for (cf32& z : samples) {
        const double i = sigma * noise.gaussian(), q = sigma * noise.gaussian();
        z += cf32{static_cast<float>(i), static_cast<float>(q)};
    }
}

/// Mean of x e^(-j turn f t): half the amplitude of a cosine whose periods fit the span.
inline cf64 line(std::span<const float> samples, double rate_hz, double hz, std::size_t first = 0) {
    cf64 sum;
    for (std::size_t n = 0; n < samples.size(); ++n) {
        const double turns = hz / rate_hz * static_cast<double>(n + first);
        sum += static_cast<double>(samples[n]) * std::polar(1.0, -turn * std::fmod(turns, 1.0));
    }
    return sum / static_cast<double>(samples.size());
}

/// Amplitude of the cosine at `hz` under a Blackman-Harris window of the span's length, which sees
/// nothing 92 dB below of what lies 4 bins and more away.
inline double windowed_amplitude(std::span<const float> samples, double rate_hz, double hz) {
    cf64 sum;
    double weight = 0.0;
    const auto size = static_cast<double>(samples.size());
    for (std::size_t n = 0; n < samples.size(); ++n) {
        const double x = turn * static_cast<double>(n) / size;
        const double w = 0.35875 - 0.48829 * std::cos(x) + 0.14128 * std::cos(2.0 * x) -
                         0.01168 * std::cos(3.0 * x);
        const double turns = hz / rate_hz * static_cast<double>(n);
        sum += w * static_cast<double>(samples[n]) * std::polar(1.0, -turn * std::fmod(turns, 1.0));
        weight += w;
    }
    return 2.0 * std::abs(sum) / weight;
}

/// Gives `samples` to `give` in uneven pieces.
template <class Sample, class Give>
void in_pieces(std::span<const Sample> samples, std::uint64_t seed, const Give& give) {
    random_stream pieces{seed};
    while (!samples.empty()) {
        const auto size = std::min<std::size_t>(samples.size(), 1 + pieces.next() % 3000);
        give(samples.first(size));
        samples = samples.subspan(size);
    }
}

/// All audio of one stretch; `seed` 0 gives it in one piece.
inline std::vector<float> detect(detector& d, std::span<const cf32> samples,
                                 std::uint64_t seed = 0) {
    std::vector<float> audio;
    d.begin();
    if (seed == 0) {
        d.add(samples, audio);
    } else {
        in_pieces(samples, seed, [&](std::span<const cf32> piece) { d.add(piece, audio); });
    }
    d.end(audio);
    return audio;
}

/// One stretch through a sink; `seed` 0 gives it in one piece.
inline void play(baseband_sink& sink, const baseband_stretch& stretch,
                 std::span<const cf32> samples, std::uint64_t seed = 0,
                 std::span<const sample_range> non_finite = {}) {
    sink.begin_stretch(stretch);
    sample_index first = 0;
    const auto give = [&](std::span<const cf32> piece) {
        sink.add({.iq = piece, .first = first, .non_finite = non_finite});
        first += static_cast<sample_index>(piece.size());
    };
    if (seed == 0) {
        give(samples);
    } else {
        in_pieces(samples, seed, give);
    }
    sink.end_stretch();
}

inline double db(double ratio) {
    return 20.0 * std::log10(ratio);
}

} // namespace tonewalk::test
