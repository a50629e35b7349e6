// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cmath>
#include <cstdint>
#include <limits>

#include "tonewalk/base/random.hpp"
#include "tonewalk/base/sample.hpp"

namespace tonewalk {

/// Conversions that give the same bits on every machine: only + - x / and square root below them.

inline constexpr double ln10_over_20 = 0.11512925464970228420089957273422;
inline constexpr double turns_per_rad = 0.15915494309189533576888376337251;

inline double amplitude_from_db(double db) noexcept {
    return std::isinf(db) && db < 0.0 ? 0.0 : exact_exp(db * ln10_over_20);
}

/// Minus infinity for 0.
inline double db_from_amplitude(double amplitude) noexcept {
    return amplitude > 0.0 ? exact_log(amplitude) / ln10_over_20
                           : -std::numeric_limits<double>::infinity();
}

/// To the nearest whole number, ties to even; |x| < 2^51.
inline double round_half_even(double x) noexcept {
    constexpr double shift = 6755399441055744.0; // 1.5 x 2^52: the sum keeps no fraction
    return (x + shift) - shift;
}

/// 64-bit phase of a number of turns, |turns| < 2^51.
inline std::uint64_t phase_from_turns(double turns) noexcept {
    const double rest = turns - round_half_even(turns); // +-1/2
    return static_cast<std::uint64_t>(static_cast<std::int64_t>(rest * 0x1p62)) << 2U;
}

inline std::uint64_t phase_from_deg(double deg) noexcept {
    return phase_step(deg, 360.0);
}

inline cf64 unit_vector(std::uint64_t phase) noexcept {
    const exact_sine_cosine turned = exact_turn(phase);
    return {turned.cosine, turned.sine};
}

/// Without the checks for infinities that std::complex carries.
inline cf64 product(cf64 a, cf64 b) noexcept {
    return {a.real() * b.real() - a.imag() * b.imag(), a.real() * b.imag() + a.imag() * b.real()};
}

inline double squared_magnitude(cf64 z) noexcept {
    return z.real() * z.real() + z.imag() * z.imag();
}

inline double magnitude(cf64 z) noexcept {
    return std::sqrt(squared_magnitude(z));
}

} // namespace tonewalk
