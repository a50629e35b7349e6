// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <span>
#include <vector>

namespace tonewalk {

/// A cosine-sum window in periodic (DFT-even) form, with its figures of merit computed from its
/// values.
class window {
public:
    /// w[n] = a0 - a1 cos(2 pi n/N) + a2 cos(4 pi n/N) - ...
    window(std::size_t size, std::span<const double> coefficients);
    [[nodiscard]] std::span<const double> values() const noexcept { return values_; }
    [[nodiscard]] std::size_t size() const noexcept { return values_.size(); }
    [[nodiscard]] double coherent_gain() const noexcept;        ///< mean of w
    [[nodiscard]] double noise_bandwidth_bins() const noexcept; ///< N sum w^2 / (sum w)^2
    [[nodiscard]] double scalloping_loss_db() const noexcept;   ///< at half a bin
    /// |correlation|^2 of the noise powers of two lines `bins` apart (0: 1).
    [[nodiscard]] double power_correlation(double bins) const noexcept;
    /// Amplitude response at `bins` off a line, 1 at 0 (real: the window is symmetric about its
    /// centre).
    [[nodiscard]] double response(double bins) const noexcept;

private:
    std::vector<double> values_, coefficients_;
};
/// Correlation of the noise that two Hann windows see whose starts lie `shift` windows apart; 1/6
/// at half a window (F. J. Harris, Proc. IEEE 66(1), 1978, from memory; closed form derived anew).
[[nodiscard]] double hann_overlap_correlation(double shift) noexcept;
/// How much larger the variance of a mean of many windows is, `shift` windows apart, than of as
/// many independent ones: of amplitudes, or of powers (whose correlations are squared).
struct overlap_inflation {
    double amplitude = 1.0, power = 1.0;
};
[[nodiscard]] overlap_inflation hann_overlap_inflation(double shift) noexcept;
[[nodiscard]] window rectangular_window(std::size_t size);
[[nodiscard]] window hann_window(std::size_t size);
[[nodiscard]] window hamming_window(std::size_t size);
[[nodiscard]] window blackman_window(std::size_t size);
[[nodiscard]] window blackman_harris_window(std::size_t size); ///< 4-term, 0.35875 ...
[[nodiscard]] window nuttall_window(std::size_t size);         ///< 4-term, 0.3635819 ...

} // namespace tonewalk
