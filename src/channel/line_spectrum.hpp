// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <optional>
#include <span>
#include <vector>

#include "line_transform.hpp"
#include "tonewalk/base/decibel.hpp"
#include "tonewalk/base/sample.hpp"

namespace tonewalk {

/// Bins on either side of a line's own that its main lobe covers.
inline constexpr std::size_t lobe_bins = 4;
/// A line counts from 12 dB over the noise beside it.
inline const double line_ratio = decibel::from_db(12.0).power_ratio();
/// Two lines mirror each other when their powers differ by 12 dB at most.
inline const double mirror_ratio = decibel::from_db(12.0).power_ratio();

/// A power spectrum whose lines read their amplitude^2 (full scale = 1), from the lowest frequency
/// to the highest, with the noise near each line.
class line_spectrum {
public:
    /// Averages transforms of `size` samples.
    line_spectrum(std::size_t size, double rate_hz);
    [[nodiscard]] std::size_t size() const noexcept { return power_.size(); }
    void add(std::span<const cf32> segment); ///< size() samples
    void finish();                           ///< averages, and finds the local noise; no more add()
    void merge(const line_spectrum&);        ///< averages with another finished one of equal size

    [[nodiscard]] double bin_hz() const noexcept {
        return rate_hz_ / static_cast<double>(power_.size());
    }
    [[nodiscard]] double hz_of(double bin) const noexcept;
    [[nodiscard]] std::size_t
    bin_of(double hz) const noexcept; ///< nearest; clamped to the spectrum
    [[nodiscard]] double power(std::size_t bin) const noexcept { return power_[bin]; }
    /// Noise of a bin, from the median of its neighbourhood.
    [[nodiscard]] double noise(std::size_t bin) const noexcept { return noise_[bin / noise_run_]; }
    [[nodiscard]] double noise_density(double hz) const noexcept { ///< full scale^2 per Hz
        return noise(bin_of(hz)) / (noise_bins_ * bin_hz());
    }
    /// White noise under everything: the median of all neighbourhoods, full scale^2 per Hz; 0 in
    /// silence.
    [[nodiscard]] double floor_density() const;
    /// Highest within its main lobe, and 12 dB over the local noise.
    [[nodiscard]] bool is_line(std::size_t bin) const noexcept;
    /// The strongest line from `low_hz` to `high_hz`.
    [[nodiscard]] std::optional<std::size_t> strongest(double low_hz,
                                                       double high_hz) const noexcept;

    /// A line between bins, by a parabola through the logarithms (within 0.02 bins, 0.02 dB).
    struct peak {
        double hz = 0.0, power = 0.0;
    };
    [[nodiscard]] peak peak_at(std::size_t bin) const noexcept;

private:
    void find_noise();

    double rate_hz_, noise_bins_ = 0.0;
    std::vector<double> power_, noise_;
    std::optional<line_transform> transform_; // while segments are added
    std::size_t segments_ = 0, noise_run_ = 1;
};

} // namespace tonewalk
