// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cmath>
#include <complex>
#include <cstddef>
#include <span>

#include "tonewalk/base/sample.hpp"

namespace tonewalk::test {

inline constexpr long double two_pi_exactly = 6.283185307179586476925286766559L;

/// e^(j 2 pi turns) in extended precision, by the standard library alone.
inline std::complex<long double> turned(long double turns) {
    const long double angle = two_pi_exactly * (turns - std::floor(turns));
    return {std::cos(angle), std::sin(angle)};
}

/// Sum of weight(k) x samples[k] x e^(-j 2 pi f k / rate): the turning vector is set anew from the
/// standard library every 64 samples and multiplied on in between.
template <typename Weight>
std::complex<double> projection(std::span<const cf64> samples, double rate_hz, double frequency_hz,
                                const Weight& weight) {
    const long double turns = static_cast<long double>(frequency_hz) / rate_hz;
    const std::complex<double> step{turned(-turns)};
    std::complex<double> turning, sum{};
    for (std::size_t k = 0; k < samples.size(); ++k) {
        turning = k % 64 == 0 ? std::complex<double>{turned(-turns * k)} : turning * step;
        sum += weight(k) * samples[k] * turning;
    }
    return sum / static_cast<double>(samples.size());
}

/// The line at `frequency_hz` by direct projection, plain mean: exact where the samples hold whole
/// cycles of every line. Its phase is that at sample 0.
inline std::complex<double> line(std::span<const cf64> samples, double rate_hz,
                                 double frequency_hz) {
    return projection(samples, rate_hz, frequency_hz, [](std::size_t) { return 1.0; });
}

/// The same under a Hann window in periodic form: samples at 0, 1/n ... of its length.
inline std::complex<double> hann_line(std::span<const cf64> samples, double rate_hz,
                                      double frequency_hz) {
    const double step = 2.0 * M_PI / static_cast<double>(samples.size());
    return projection(samples, rate_hz, frequency_hz,
                      [&](std::size_t k) { return 1.0 - std::cos(step * static_cast<double>(k)); });
}

inline double db(double amplitude) {
    return 20.0 * std::log10(amplitude);
}

inline double mean_power(std::span<const cf64> samples) {
    double sum = 0.0;
    for (const cf64& z : samples)
        sum += std::norm(z);
    return sum / static_cast<double>(samples.size());
}

} // namespace tonewalk::test
