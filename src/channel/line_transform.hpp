// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <span>
#include <vector>

#include "tonewalk/base/sample.hpp"
#include "tonewalk/maths/fft.hpp"

namespace tonewalk {

/// The transform of one segment through a Blackman-Harris window, scaled so that a line reads its
/// amplitude.
class line_transform {
public:
    explicit line_transform(std::size_t size);
    [[nodiscard]] std::size_t size() const noexcept { return weights_.size(); }
    /// Of size() samples; 0 Hz first, the negative frequencies from the middle on. Valid until the
    /// next run.
    [[nodiscard]] std::span<const cf32> run(std::span<const cf32> segment);
    [[nodiscard]] std::span<const float> weights() const noexcept { return weights_; } ///< sum 1
    [[nodiscard]] double noise_bins() const noexcept { return noise_bins_; }

private:
    std::vector<float> weights_;
    double noise_bins_ = 0.0;
    fft transform_;
};

} // namespace tonewalk
