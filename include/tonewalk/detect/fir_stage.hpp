// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <span>
#include <vector>

#include "tonewalk/base/sample.hpp"

namespace tonewalk {

/// Symmetric FIR over one stretch, its rate changed by up/down; Sample is float or cf32.
///   output    number j stands at input position j down/up: the filter's delay is removed; in all
///             ceil(inputs up/down) outputs, appended to `out`
///   edges     the input is mirrored about its first and last sample, so that a steady carrier
///   stays steady blocks    any split of the input yields identical output; an output appears as
///   soon as the
///             reach_samples() inputs after it are known
///   cost      taps/up multiply-adds per output, in double
template <class Sample>
class fir_stage {
public:
    struct config {
        std::vector<double> taps; ///< odd number, symmetric, sum 1, at up times the input's rate
        std::size_t up = 1;
        std::size_t down = 1;
    };
    explicit fir_stage(const config&);
    void begin() noexcept; ///< starts a stretch, as new
    void add(std::span<const Sample> in, std::vector<Sample>& out);
    void end(std::vector<Sample>& out);
    /// Input samples on either side of an output that it depends on.
    [[nodiscard]] std::size_t reach_samples() const noexcept { return reach_; }

private:
    void mirror_start(); ///< puts reach_ mirrored samples before the first
    void mirror_end();
    void produce(std::vector<Sample>& out);
    void forget();

    std::size_t up_, down_, reach_ = 0;
    std::vector<double> rows_;    // design: up_ rows of 2 reach_ + 1, in the order of the input
    std::vector<Sample> history_; // state: inputs from first_ on
    sample_index first_ = 0;      // state: index of history_[0] in the stretch
    sample_index inputs_ = 0;     // state: inputs so far
    sample_index outputs_ = 0;    // state: outputs so far
    bool mirrored_ = false;       // state: the start is mirrored
};
extern template class fir_stage<float>;
extern template class fir_stage<cf32>;

} // namespace tonewalk
