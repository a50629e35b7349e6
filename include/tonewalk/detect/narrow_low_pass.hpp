// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <optional>
#include <span>
#include <vector>

#include "tonewalk/detect/fir_stage.hpp"

namespace tonewalk {

/// The slow part of a signal at the signal's own rate: decimated to about 8 times the stop edge,
/// then interpolated back, so that a filter of tens of hertz costs little at any rate. Linear
/// phase, delay removed, as many outputs as inputs; edges and blocks as in fir_stage. Sample is
/// float or cf32.
template <class Sample>
class narrow_low_pass {
public:
    struct config {
        double rate_hz = 0.0;          ///< > 0
        double pass_edge_hz = 0.0;     ///< flat up to here
        double stop_edge_hz = 0.0;     ///< pass < stop <= rate/2
        double attenuation_db = 100.0; ///< from the stop edge on
    };
    explicit narrow_low_pass(const config&); ///< throws error{bad_request} on edges out of order
    void begin() noexcept;
    void add(std::span<const Sample> in, std::vector<Sample>& out); ///< appends
    void end(std::vector<Sample>& out);
    /// Outputs 0, factor(), 2 factor() ... hold all there is to know: the decimated signal.
    [[nodiscard]] std::size_t factor() const noexcept { return factor_; }
    /// Input samples on either side of an output that it depends on.
    [[nodiscard]] std::size_t reach_samples() const noexcept;

private:
    void expand(std::vector<Sample>& out);

    std::size_t factor_;
    fir_stage<Sample> decimator_;
    std::optional<fir_stage<Sample>> interpolator_; // none when factor_ is 1
    std::vector<Sample> slow_;                      // scratch
    sample_index inputs_ = 0, outputs_ = 0;         // state
};
extern template class narrow_low_pass<float>;
extern template class narrow_low_pass<cf32>;

} // namespace tonewalk
