// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <array>
#include <cstddef>
#include <span>

#include "tonewalk/base/sample.hpp"

namespace tonewalk {

/// Sum of taps times input, in double. Several sums side by side, always in the same order: quick
/// without any licence to reorder, and the same bits wherever it is called.
inline double dot(std::span<const double> taps, const float* in) noexcept {
    std::array<double, 4> sums{};
    std::size_t i = 0;
    for (; i + 4 <= taps.size(); i += 4) {
        for (std::size_t lane = 0; lane < 4; ++lane) {
            sums[lane] += taps[i + lane] * static_cast<double>(in[i + lane]);
        }
    }
    for (; i < taps.size(); ++i) {
        sums[0] += taps[i] * static_cast<double>(in[i]);
    }
    return (sums[0] + sums[1]) + (sums[2] + sums[3]);
}

inline cf64 dot(std::span<const double> taps, const cf32* in) noexcept {
    std::array<double, 2> real{}, imag{};
    std::size_t i = 0;
    for (; i + 2 <= taps.size(); i += 2) {
        for (std::size_t lane = 0; lane < 2; ++lane) {
            real[lane] += taps[i + lane] * static_cast<double>(in[i + lane].real());
            imag[lane] += taps[i + lane] * static_cast<double>(in[i + lane].imag());
        }
    }
    for (; i < taps.size(); ++i) {
        real[0] += taps[i] * static_cast<double>(in[i].real());
        imag[0] += taps[i] * static_cast<double>(in[i].imag());
    }
    return {real[0] + real[1], imag[0] + imag[1]};
}

} // namespace tonewalk
