// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <complex>
#include <cstdint>

namespace tonewalk {

using cf32 = std::complex<float>; ///< one IQ sample, full scale = 1.0
using cf64 = std::complex<double>;
using sample_index = std::int64_t; ///< samples of one lane; 0 is the recording's first sample

/// Samples [first, first + count).
struct sample_range {
    sample_index first = 0;
    sample_index count = 0;
};

} // namespace tonewalk
