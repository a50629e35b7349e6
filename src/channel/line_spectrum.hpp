// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <span>
#include <vector>

#include "tonewalk/base/sample.hpp"
#include "tonewalk/maths/window.hpp"

namespace tonewalk {

/// A power spectrum whose lines read their amplitude^2 (full scale = 1), from the lowest frequency
/// to the highest, with the noise near each line.
class line_spectrum {
public:
    /// Averages transforms of `size` samples, Blackman-Harris windows half overlapping.
    line_spectrum(std::size_t size, double rate_hz);
    [[nodiscard]] std::size_t size() const noexcept { return power_.size(); }
    void add(std::span<const cf32> segment); ///< size() samples
    void finish();                           ///< averages, and finds the local noise

    [[nodiscard]] double bin_hz() const noexcept {
        return rate_hz_ / static_cast<double>(power_.size());
    }
    [[nodiscard]] double hz_of(double bin) const noexcept;
    [[nodiscard]] std::size_t
    bin_of(double hz) const noexcept; ///< nearest; clamped to the spectrum
    [[nodiscard]] double power(std::size_t bin) const noexcept { return power_[bin]; }
    /// Noise of a bin, from the median of its neighbourhood.
    [[nodiscard]] double noise(std::size_t bin) const noexcept { return noise_[bin / noise_run_]; }
    [[nodiscard]] double noise_bandwidth_hz() const noexcept { return noise_bins_ * bin_hz(); }
    /// Highest within its main lobe, and `ratio` over the local noise.
    [[nodiscard]] bool is_line(std::size_t bin, double ratio) const noexcept;
    /// Peak between bins, by a parabola through the logarithms.
    [[nodiscard]] double peak_hz(std::size_t bin) const noexcept;
    [[nodiscard]] std::span<const double> powers() const noexcept { return power_; }

private:
    double rate_hz_, noise_bins_;
    window window_;
    std::vector<double> power_, noise_;
    std::size_t segments_ = 0, noise_run_ = 1;
};

} // namespace tonewalk
