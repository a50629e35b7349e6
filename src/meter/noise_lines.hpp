// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <complex>
#include <functional>
#include <map>
#include <span>
#include <vector>

#include "sample_runs.hpp"
#include "tonewalk/base/sample.hpp"
#include "tonewalk/maths/fft.hpp"
#include "tonewalk/maths/window.hpp"

namespace tonewalk {

/// A line that was fitted: amplitude and phase at the record's centre.
struct fitted_line {
    double hz = 0.0;
    cf64 amplitude;
};

/// What the lines between the fitted ones say of the noise.
struct noise_reading {
    double mean_power = 0.0;  ///< of a Hann line of the record; 0 without lines
    double independent = 0.0; ///< K: how many independent ones they amount to
};

/// Noise of one record, from the lines of a Blackman-Harris-windowed transform after the fitted
/// lines are taken out: those inside the flat width, 4 bins or more from a fitted line and, for
/// windows of 100 ms and longer, 1 bin or more from multiples of 50 and 60 Hz up to 1 kHz off the
/// carrier.
class noise_lines {
public:
    struct config {
        double rate_hz = 0.0;
        std::size_t record_samples = 0;
        double width_hz = 0.0;
        std::function<double(double)> response; ///< channel's amplitude response
    };
    explicit noise_lines(const config&);
    /// The first line is the carrier. record.samples() == record_samples.
    [[nodiscard]] noise_reading measure(const sample_runs& record,
                                        std::span<const fitted_line> lines);
    /// Power of each transform line of the last record, fitted lines taken out, as of Hann lines;
    /// index 0 is 0 Hz, then upwards, negative frequencies last.
    [[nodiscard]] std::span<const float> line_powers() const noexcept { return powers_; }
    [[nodiscard]] double bin_hz() const noexcept { return bin_hz_; }
    /// The strongest of those lines within `reach_hz` of `hz`.
    struct spectral_line {
        double hz = 0.0, power = 0.0;
    };
    [[nodiscard]] spectral_line strongest_near(double hz, double reach_hz) const noexcept;
    /// How many lines a record with these fitted lines would average.
    [[nodiscard]] std::size_t usable(std::span<const fitted_line> lines) const;

private:
    void transform(const sample_runs& record, std::span<const fitted_line> lines);
    [[nodiscard]] bool is_usable(double hz, std::span<const fitted_line> lines) const noexcept;
    [[nodiscard]] noise_reading average();
    struct small_sample {
        double bias = 1.0; // mean after the outlier rule over the true mean
        double independent = 0.0;
    };
    const small_sample& small_sample_for(const std::vector<int>& bins);

    double rate_hz_, width_hz_, bin_hz_;
    std::size_t record_samples_;
    fft fft_;
    window window_;
    std::vector<double> scale_;       // |sum|^2 to that power, the response taken off, by bin
    std::vector<double> correlation_; // of powers, by distance in bins
    std::vector<float> powers_;
    std::vector<run_phasor> running_;
    std::vector<int> chosen_; // bins, ascending frequency
    std::vector<double> kept_, sorted_;
    std::map<std::vector<int>, small_sample> small_samples_;
};

} // namespace tonewalk
