// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <optional>
#include <span>
#include <vector>

namespace tonewalk {

struct fitted_sine {
    double frequency_hz = 0.0, frequency_sigma_hz = 0.0; ///< sigma 0 where it was given
    double amplitude = 0.0, amplitude_sigma = 0.0;
    double phase_rad = 0.0; ///< of a cosine at sample 0, (-pi, pi]
};

struct sine_fit_request {
    double rate_hz = 0.0;               ///< > 0
    std::vector<double> frequencies_hz; ///< each in (0, rate/2), one or more bins apart
    bool refine_frequencies = false;    ///< they are starting points, within half a bin
    std::span<const double> weights{};  ///< of each sample's square; empty: 1
};

/// offset + the sum of amplitude cos(2 pi f n / rate + phase).
struct sine_fit {
    double offset = 0.0;
    std::vector<fitted_sine> sines; ///< in the order given
    double residual_rms = 0.0;      ///< of what is left, weighted
};

/// Least-squares fit of several sines and an offset in the form of IEEE Std 1057 (three parameters
/// a sine with known frequency, four with an unknown one; from memory). Sigmas take what is left as
/// white noise. Nothing where samples are fewer than parameters, sines cannot be told apart, or
/// refining does not settle. Cost samples x parameters^2 a round; no copy of the samples is made.
[[nodiscard]] std::optional<sine_fit> fit_sines(std::span<const double> samples,
                                                const sine_fit_request&);

} // namespace tonewalk
