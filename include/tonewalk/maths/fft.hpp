// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <memory>
#include <span>

#include "tonewalk/base/sample.hpp"

namespace tonewalk {

/// Complex transform of fixed length (any length; products of 2, 3, 5, 7 are fast), single
/// precision, not normalised: forward then inverse multiplies by size(). Plans are estimated, never
/// timed, so runs repeat exactly. Construct from any thread; an object is used by one thread at a
/// time. No allocation in run().
class fft {
public:
    enum class direction { forward, inverse };
    explicit fft(std::size_t size, direction = direction::forward);
    fft(fft&&) noexcept;
    fft& operator=(fft&&) noexcept;
    ~fft();
    [[nodiscard]] std::size_t size() const noexcept;
    [[nodiscard]] std::span<cf32> input() noexcept; ///< own aligned buffer; kept by run()
    [[nodiscard]] std::span<const cf32> output() const noexcept;
    void run() noexcept;

private:
    struct state;
    std::unique_ptr<state> state_;
};

/// The least length >= n that has no prime factor above 7.
[[nodiscard]] std::size_t fast_fft_size(std::size_t n) noexcept;

} // namespace tonewalk
