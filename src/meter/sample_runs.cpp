// SPDX-License-Identifier: GPL-3.0-or-later
#include "sample_runs.hpp"

#include <cmath>
#include <numbers>

#include "tonewalk/maths/window.hpp"

namespace tonewalk {

sample_runs::sample_runs(std::size_t samples)
    : samples_{samples}, runs_((samples + run_samples - 1) / run_samples) {}

void sample_runs::set(std::span<const cf32> record) {
    for (std::size_t n = 0; n < samples_; ++n) {
        run& r = runs_[n / run_samples];
        r.re[n % run_samples] = static_cast<double>(record[n].real());
        r.im[n % run_samples] = static_cast<double>(record[n].imag());
    }
}

void sample_runs::set(std::span<const cf32> record, std::span<const double> weights) {
    for (std::size_t n = 0; n < samples_; ++n) {
        run& r = runs_[n / run_samples];
        r.re[n % run_samples] = weights[n] * static_cast<double>(record[n].real());
        r.im[n % run_samples] = weights[n] * static_cast<double>(record[n].imag());
    }
}

std::vector<double> hann_weights(std::size_t samples) {
    const window hann = hann_window(samples);
    std::vector<double> weights(hann.values().begin(), hann.values().end());
    const double sum = hann.coherent_gain() * static_cast<double>(samples);
    for (double& w : weights) {
        w /= sum;
    }
    return weights;
}

run_phasor::run_phasor(double turns_per_sample, cf64 start) : now_{start} {
    const cf64 turn = std::polar(1.0, 2.0 * std::numbers::pi * turns_per_sample);
    step_ = {1.0, 0.0};
    for (std::size_t k = 0; k < run_samples; ++k) {
        table_.re[k] = step_.real();
        table_.im[k] = step_.imag();
        step_ = product(step_, turn);
    }
}

void run_phasor::next_run() noexcept {
    now_ = product(now_, step_);
}

} // namespace tonewalk
