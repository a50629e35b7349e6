// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <array>
#include <complex>
#include <cstddef>
#include <span>
#include <vector>

#include "tonewalk/base/sample.hpp"

namespace tonewalk {

constexpr std::size_t run_samples = 64;
using run_values = std::array<double, run_samples>;

/// One record in runs of a fixed length, real and imaginary parts apart, the last run filled up
/// with zeros: every loop over a run has a length that the compiler knows.
class sample_runs {
public:
    struct run {
        run_values re{}, im{};
    };
    explicit sample_runs(std::size_t samples);
    /// record.size() == samples(), weights.size() == samples().
    void set(std::span<const cf32> record);
    void set(std::span<const cf32> record, std::span<const double> weights);
    [[nodiscard]] std::size_t samples() const noexcept { return samples_; }
    [[nodiscard]] std::span<const run> runs() const noexcept { return runs_; }

private:
    std::size_t samples_;
    std::vector<run> runs_;
};

/// A Hann window that sums to 1.
[[nodiscard]] std::vector<double> hann_weights(std::size_t samples);

/// A turning phasor, `start` at the record's first sample, taken run by run: sample k of the
/// present run is now() x table()[k].
class run_phasor {
public:
    run_phasor(double turns_per_sample, cf64 start);
    [[nodiscard]] cf64 now() const noexcept { return now_; }
    [[nodiscard]] const sample_runs::run& table() const noexcept { return table_; }
    void next_run() noexcept;

private:
    sample_runs::run table_;
    cf64 now_, step_;
};

/// Complex product without the library's care for infinities.
[[nodiscard]] inline cf64 product(cf64 a, cf64 b) noexcept {
    return {a.real() * b.real() - a.imag() * b.imag(), a.real() * b.imag() + a.imag() * b.real()};
}

} // namespace tonewalk
