// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/base/random.hpp"

#include <bit>
#include <cassert>
#include <cmath>
#include <initializer_list>

namespace tonewalk {
namespace {

/// splitmix64: spreads a seed over 64 bits; a bijection of its counter.
class seed_spreader {
public:
    explicit seed_spreader(std::uint64_t start) noexcept : counter_{start} {}
    std::uint64_t next() noexcept {
        counter_ += 0x9e3779b97f4a7c15U;
        std::uint64_t z = counter_;
        z = (z ^ (z >> 30U)) * 0xbf58476d1ce4e5b9U;
        z = (z ^ (z >> 27U)) * 0x94d049bb133111ebU;
        return z ^ (z >> 31U);
    }

private:
    std::uint64_t counter_;
};

constexpr double turn_per_phase_rad = 6.283185307179586476925286766559 / 18446744073709551616.0;
constexpr double ln2_high = 6.93147180369123816490e-01; // 32 bits: n x ln2_high is exact
constexpr double ln2_low = 1.90821492927058770002e-10;
constexpr double inverse_ln2 = 1.44269504088896340736;

/// Taylor series on |x| <= pi/4; the first term left out is below 1e-16 of the sum.
double sine_of_octant(double x, double square) noexcept {
    const double tail =
        -1.0 / 6 +
        square * (1.0 / 120 +
                  square * (-1.0 / 5040 +
                            square * (1.0 / 362880 +
                                      square * (-1.0 / 39916800 +
                                                square * (1.0 / 6227020800.0 +
                                                          square * (-1.0 / 1307674368000.0))))));
    return x + x * (square * tail);
}

double cosine_of_octant(double square) noexcept {
    const double tail =
        1.0 / 24 +
        square * (-1.0 / 720 +
                  square * (1.0 / 40320 +
                            square * (-1.0 / 3628800 +
                                      square * (1.0 / 479001600.0 +
                                                square * (-1.0 / 87178291200.0 +
                                                          square * (1.0 / 20922789888000.0))))));
    return 1.0 - (0.5 * square - square * (square * tail));
}

} // namespace

random_stream::random_stream(std::uint64_t seed, std::uint64_t stream) noexcept {
    seed_spreader of_stream{stream};
    seed_spreader spreader{seed ^ of_stream.next()};
    for (std::uint64_t& word : state_)
        word = spreader.next();
}

// xoshiro256**, D. Blackman and S. Vigna, ACM Trans. Math. Software 47(4), 2021.
std::uint64_t random_stream::next() noexcept {
    const std::uint64_t result = std::rotl(state_[1] * 5U, 7) * 9U;
    const std::uint64_t shifted = state_[1] << 17U;
    state_[2] ^= state_[0];
    state_[3] ^= state_[1];
    state_[1] ^= state_[2];
    state_[0] ^= state_[3];
    state_[2] ^= shifted;
    state_[3] = std::rotl(state_[3], 45);
    return result;
}

double random_stream::uniform() noexcept {
    return static_cast<double>(next() >> 11U) * 0x1p-53;
}

double random_stream::uniform(double low, double high) noexcept {
    return low + (high - low) * uniform();
}

// Marsaglia's polar method: a point in the unit disc gives two independent values.
double random_stream::gaussian() noexcept {
    if (has_spare_) {
        has_spare_ = false;
        return spare_;
    }
    double x = 0.0, y = 0.0, square = 0.0;
    do {
        x = 2.0 * uniform() - 1.0;
        y = 2.0 * uniform() - 1.0;
        square = x * x + y * y;
    } while (square >= 1.0 || square == 0.0);
    const double stretch = std::sqrt(-2.0 * exact_log(square) / square);
    spare_ = y * stretch;
    has_spare_ = true;
    return x * stretch;
}

exact_sine_cosine exact_turn(std::uint64_t phase) noexcept {
    const std::uint64_t quarter = (phase + (std::uint64_t{1} << 61U)) >> 62U;
    const auto rest = static_cast<std::int64_t>(phase - (quarter << 62U)); // +-2^61: an eighth
    const double x = static_cast<double>(rest) * turn_per_phase_rad;
    const double square = x * x;
    const double sine = sine_of_octant(x, square), cosine = cosine_of_octant(square);
    const bool swapped = (quarter & 1U) != 0;
    const double along = swapped ? sine : cosine, across = swapped ? cosine : sine;
    const bool cosine_negative = ((quarter + 1U) & 2U) != 0, sine_negative = (quarter & 2U) != 0;
    return {sine_negative ? -across : across, cosine_negative ? -along : along};
}

// log x = e log 2 + 2 artanh s, s = (m - 1)/(m + 1), m = x / 2^e within a factor sqrt 2 of 1.
double exact_log(double x) noexcept {
    assert(x > 0.0);
    int exponent = 0;
    if (x < 0x1p-1022) {
        x *= 0x1p54;
        exponent = -54;
    }
    const auto bits = std::bit_cast<std::uint64_t>(x);
    exponent += static_cast<int>(bits >> 52U) - 1023;
    double mantissa =
        std::bit_cast<double>((bits & 0x000fffffffffffffU) | 0x3ff0000000000000U); // [1, 2)
    if (mantissa > 1.41421356237309514547) {
        mantissa *= 0.5;
        ++exponent;
    }
    const double s = (mantissa - 1.0) / (mantissa + 1.0);
    const double square = s * s;
    double series = 1.0 / 23;
    for (const double coefficient : {1.0 / 21, 1.0 / 19, 1.0 / 17, 1.0 / 15, 1.0 / 13, 1.0 / 11,
                                     1.0 / 9, 1.0 / 7, 1.0 / 5, 1.0 / 3})
        series = coefficient + square * series;
    const double n = exponent;
    return n * ln2_high + (2.0 * s + (2.0 * s * (square * series) + n * ln2_low));
}

// e^x = 2^n e^r, |r| <= ln(2)/2.
double exact_exp(double x) noexcept {
    assert(x > -700.0 && x < 700.0);
    constexpr double rounding =
        6755399441055744.0; // 1.5 x 2^52: adding it rounds to a whole number
    const double n = (x * inverse_ln2 + rounding) - rounding;
    const double r = (x - n * ln2_high) - n * ln2_low;
    double series = 1.0 / 6227020800.0;
    for (const double coefficient :
         {1.0 / 479001600.0, 1.0 / 39916800, 1.0 / 3628800, 1.0 / 362880, 1.0 / 40320, 1.0 / 5040,
          1.0 / 720, 1.0 / 120, 1.0 / 24, 1.0 / 6, 1.0 / 2})
        series = coefficient + r * series;
    const double power = std::bit_cast<double>(
        static_cast<std::uint64_t>(static_cast<std::int64_t>(n) + 1023) << 52U);
    return power * (1.0 + (r + r * (r * series)));
}

// Long division bit by bit: doubling is exact, and so is a subtraction within a factor of two.
std::uint64_t phase_step(double frequency_hz, double rate_hz) noexcept {
    assert(rate_hz > 0.0);
    double rest = std::fmod(frequency_hz < 0.0 ? -frequency_hz : frequency_hz, rate_hz);
    std::uint64_t step = 0;
    for (int bit = 0; bit < 64; ++bit) {
        rest *= 2.0;
        step <<= 1U;
        if (rest >= rate_hz) {
            rest -= rate_hz;
            step |= 1U;
        }
    }
    if (rest * 2.0 >= rate_hz)
        ++step;
    return frequency_hz < 0.0 ? std::uint64_t{0} - step : step;
}

} // namespace tonewalk
