// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstdint>

namespace tonewalk {

/// Deterministic random numbers: the same on every machine, compiler and instruction set (64-bit
/// integer state; the Gaussian uses only + - x / and square root). Streams of different names are
/// independent.
class random_stream {
public:
    explicit random_stream(std::uint64_t seed, std::uint64_t stream = 0) noexcept;
    std::uint64_t next() noexcept;                    ///< uniform 64 bits
    double uniform() noexcept;                        ///< [0, 1), 53 bits
    double uniform(double low, double high) noexcept; ///< [low, high)
    double gaussian() noexcept;                       ///< mean 0, variance 1

private:
    std::uint64_t state_[4];
    double spare_ = 0.0;
    bool has_spare_ = false;
};

/// Sine, cosine and logarithm from + - x / alone, the same bits everywhere; within 4 units of the
/// last place.
struct exact_sine_cosine {
    double sine, cosine;
};
/// `turns` of a 64-bit phase accumulator: phase / 2^64 of a full turn.
[[nodiscard]] exact_sine_cosine exact_turn(std::uint64_t phase) noexcept;
[[nodiscard]] double exact_log(double x) noexcept; ///< natural logarithm, x > 0
[[nodiscard]] double exact_exp(double x) noexcept; ///< e to the x, |x| < 700
/// Phase step per sample of `frequency_hz` at `rate_hz`: round(f/r 2^64) modulo 2^64, from + - x /
/// alone.
[[nodiscard]] std::uint64_t phase_step(double frequency_hz, double rate_hz) noexcept;

} // namespace tonewalk
