// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <complex>
#include <vector>

#include "sample_runs.hpp"
#include "tonewalk/base/sample.hpp"

namespace tonewalk {

/// How many moments are kept: of the whole window, and of each run of it on the
/// way there.
struct moment_orders {
    std::size_t window = 0, run = 0;
};
/// Enough to reach `most_offset_hz` to 1e-10 of the line.
[[nodiscard]] moment_orders orders_reaching(double most_offset_hz, double window_s,
                                            double rate_hz) noexcept;

/// A record's Hann-windowed correlation at one frequency f0, with its moments
/// in time, so that the correlation at f0 + delta is a short exact series: X(f0
/// + delta) = sum over p of
/// (-j pi delta T)^p / p! M_p, with M_p the mean of w x (2t/T)^p e^(-j 2 pi f0
/// t), t from the centre. A line of amplitude a at f0 + delta gives X = a.
class line_moments {
public:
    line_moments() = default;
    /// `weighted`: the record times a window that sums to 1.
    line_moments(const sample_runs& weighted, double rate_hz, double f0_hz, const moment_orders&);
    [[nodiscard]] double f0_hz() const noexcept { return f0_hz_; }
    [[nodiscard]] cf64 at(double hz) const noexcept { return derivative(hz, 0); }
    /// The correlation with a line that is at `hz` in the middle and drifts by `slope_hz_s`.
    [[nodiscard]] cf64 at(double hz, double slope_hz_s) const noexcept;
    /// X and its first two derivatives by frequency, per Hz.
    struct series {
        cf64 value, first, second;
    };
    [[nodiscard]] series derivatives(double hz) const noexcept;

private:
    /// By theta, `order` times.
    [[nodiscard]] cf64 derivative(double hz, std::size_t order) const noexcept;
    std::vector<cf64> coefficients_; // of the series in theta = pi delta T
    double f0_hz_ = 0.0, window_s_ = 0.0;
};

/// Amplitude of a line `bins` (delta T) off in a Hann-windowed correlation, 1
/// at 0.
[[nodiscard]] double hann_response(double bins) noexcept;
/// How many bins off its true place a line was read whose power gives this Newton step
/// (-slope/bend) towards its peak, in bins; |result| <= 0.5.
[[nodiscard]] double hann_offset_bins(double newton_step_bins) noexcept;
/// The largest that |hann_response| takes from `bins` on.
[[nodiscard]] double hann_leakage_bound(double bins) noexcept;

} // namespace tonewalk
