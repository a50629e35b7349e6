// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <span>
#include <vector>

#include "tonewalk/base/sample.hpp"

namespace tonewalk {

/// One low-pass and decimation step of a chain. Output n is centred on input n x decimation; before
/// the first input and after the last there are zeros. Any split of the input gives identical
/// output.
class decimator {
public:
    decimator(std::vector<double> taps, double rate_hz, std::size_t decimation);
    /// As new; the first input has index `first_input`. Returns the index of the first output.
    sample_index begin(sample_index first_input);
    void add(std::span<const cf32> in, std::vector<cf32>& out);
    void end(std::vector<cf32>& out); ///< what still stands inside the filter
    [[nodiscard]] std::size_t half_taps() const noexcept { return half_; }
    [[nodiscard]] std::size_t decimation() const noexcept { return decimation_; }
    [[nodiscard]] double output_rate_hz() const noexcept {
        return rate_hz_ / static_cast<double>(decimation_);
    }
    [[nodiscard]] double response(double hz) const noexcept;

private:
    void produce(std::vector<cf32>& out);
    std::vector<double> taps_; // design: symmetric
    double rate_hz_;
    std::size_t half_, decimation_, padded_;
    std::vector<float> lane_taps_;        // design: taps, zeros at the end to whole lanes
    std::vector<float> real_, imaginary_; // state: inputs from start_ on
    sample_index start_ = 0, next_output_ = 0;
};

} // namespace tonewalk
