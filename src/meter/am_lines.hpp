// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <optional>

#include "line_moments.hpp"

namespace tonewalk {

/// Amplitudes of the carrier and of the tone's upper and lower line.
struct three_lines {
    cf64 carrier, upper, lower;
};

/// Tone power by its phase against the record's own carrier, noise taken off.
struct split_power {
    double in_phase = 0.0; ///< (mA)^2
    double across = 0.0;   ///< (incidental phase x A)^2
};
/// `line_noise` is N; the carrier's own noise, which mixes the two, is solved for.
[[nodiscard]] split_power split_tone(const three_lines&, double line_noise) noexcept;

/// Slope and bend of the tone lines' power by the tone's frequency.
struct power_bend {
    double slope = 0.0, bend = 0.0;
};

/// What a record keeps of its lines: enough to read them at any frequency nearby.
class am_lines {
public:
    struct config {
        double rate_hz = 0.0;
        double carrier_hz = 0.0; ///< where to correlate
        std::optional<double> tone_hz;
        moment_orders orders;
    };
    am_lines(const sample_runs& weighted, const config&);
    /// The lines of a carrier at `hz` in the record's middle that drifts by `slope_hz_s`; what the
    /// window leaks from each into the others is taken out.
    [[nodiscard]] three_lines at(double hz, double slope_hz_s) const;
    /// Where the carrier line is highest, `reach_hz` off the place of correlation at most.
    [[nodiscard]] double carrier_peak_hz(double reach_hz) const;
    [[nodiscard]] power_bend tone_bend(double carrier_hz) const;
    [[nodiscard]] double carrier_hz() const noexcept { return carrier_.f0_hz(); }

private:
    line_moments carrier_, upper_, lower_;
    std::optional<double> tone_hz_;
    double tone_bins_ = 0.0;
};

} // namespace tonewalk
