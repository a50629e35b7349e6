// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <cstdint>
#include <span>
#include <vector>

#include "tonewalk/base/sample.hpp"

namespace tonewalk {

/// A place between samples: whole + fraction / 2^64.
struct fine_position {
    sample_index whole = 0;
    std::uint64_t fraction = 0;
};

/// Changes the rate of real audio by any ratio, and limits its band, with a Kaiser-windowed sinc.
///   output    number k stands exactly at input position first + k input_rate/output_rate, k
///   counted from
///             begin(), as long as the position lies before the input's end; beyond both ends the
///             input is zero. Delay removed.
///   exactness the position is k times a ratio of 64 fractional bits, never accumulated: after 10^9
///   outputs
///             it is off by less than 10^-10 samples. (liquid-dsp's resampler steps a 24-bit phase,
///             which drifts by milliseconds within an hour: that is why this one exists.)
///   accuracy  pass band flat to 0.0001 dB; stop band, images and aliases at least 100 dB down
///   blocks    any split of the input yields identical output
class audio_resampler {
public:
    struct config {
        double input_rate_hz = 0.0;    ///< > 0
        double output_rate_hz = 0.0;   ///< > 0
        double pass_edge_hz = 0.0;     ///< flat up to here
        double stop_edge_hz = 0.0;     ///< pass < stop <= half the lesser rate
        double attenuation_db = 110.0; ///< from the stop edge on
    };
    explicit audio_resampler(const config&); ///< throws error{bad_request} on edges out of order
    /// Starts a stretch whose first output stands at input position `first_position` >= 0.
    void begin(double first_position) noexcept;
    void add(std::span<const float> in, std::vector<float>& out); ///< appends
    void end(std::vector<float>& out);
    [[nodiscard]] sample_index outputs() const noexcept { return outputs_; } ///< since begin()
    [[nodiscard]] fine_position position(sample_index output) const noexcept;
    [[nodiscard]] std::size_t reach_samples() const noexcept { return reach_; }

private:
    void produce(sample_index end, std::vector<float>& out);
    [[nodiscard]] float output_at(const fine_position&) const noexcept;

    sample_index step_whole_;        // design: input samples per output
    std::uint64_t step_fraction_;    // design
    std::size_t phases_, reach_ = 0; // design
    std::vector<double>
        rows_;            // design: phases_ + 1 rows of 2 reach_ + 1, in the order of the input
    fine_position start_; // state
    std::vector<float> history_;                        // state: inputs from first_ on
    sample_index first_ = 0, inputs_ = 0, outputs_ = 0; // state
};

} // namespace tonewalk
