// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <span>
#include <vector>

#include "tonewalk/base/sample.hpp"
#include "tonewalk/maths/fft.hpp"
#include "tonewalk/maths/window.hpp"

namespace tonewalk {

/// The power spectrum of a stream, averaged over windowed transforms that overlap by half (Welch).
/// A line on a bin reads its amplitude^2; white noise reads its density x noise bandwidth. Any
/// split of the stream gives the same spectrum. No allocation in add().
class averaged_spectrum {
public:
    explicit averaged_spectrum(const window&); ///< transforms as long as the window
    void add(std::span<const cf32>) noexcept;
    [[nodiscard]] std::size_t size() const noexcept { return powers_.size(); }
    [[nodiscard]] std::size_t segments() const noexcept { return segments_; }
    /// Full scale^2 a bin, from the lowest frequency to the highest: 0 Hz is bin size()/2. Zeros
    /// while the stream is shorter than the window.
    [[nodiscard]] std::vector<double> powers() const;

private:
    void transform() noexcept;
    fft fft_;
    std::vector<float> weights_; // window over its sum
    std::vector<cf32> waiting_;  // the newest samples, at most size()
    std::size_t filled_ = 0, segments_ = 0;
    std::vector<double> powers_; // sums, in the transform's order
};

} // namespace tonewalk
