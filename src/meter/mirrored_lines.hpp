// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <array>
#include <cstddef>

#include "sample_runs.hpp"

namespace tonewalk {

/// The carrier of a record and pairs of lines that mirror each other about it, read together: what
/// turns the one into the other turns its mirror too, at half the work of lines one by one.
class mirrored_lines {
public:
    static constexpr std::size_t pairs = 3;
    /// `off_carrier_hz`: how far off the carrier the pairs lie.
    mirrored_lines(double rate_hz, std::size_t record_samples,
                   const std::array<double, pairs>& off_carrier_hz);
    struct pair {
        cf64 upper, lower;
    };
    /// Amplitudes and phases at the record's centre, of lines about `carrier_hz`.
    struct reading {
        cf64 carrier;
        double offset_hz = 0.0; ///< of the carrier from where it was read: its turn between halves
        std::array<pair, pairs> sides;
    };
    /// `weighted`: the record times a Hann window that sums to 1.
    [[nodiscard]] reading read(const sample_runs& weighted, double carrier_hz) const;

private:
    double rate_hz_, centre_; // centre: of a record, samples
    std::array<run_phasor, pairs> phasors_;
};

} // namespace tonewalk
