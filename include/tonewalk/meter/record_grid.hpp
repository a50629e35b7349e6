// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <algorithm>
#include <cmath>
#include <cstddef>

#include "tonewalk/base/sample.hpp"

namespace tonewalk {

/// Where the records of a stretch lie. Every meter of one channel uses the same grid, so that row n
/// of one is row n of the other. Records lie wholly inside the stretch, the first at its first
/// sample; where half the channel's filter exceeds 1 % of the window, that half is skipped at both
/// ends.
struct record_grid {
    double rate_hz = 0.0;           ///< of the baseband samples, > 0
    double every_s = 0.1;           ///< spacing of records, > 0
    double window_s = 0.2;          ///< length of one, > 0
    std::size_t settle_samples = 0; ///< half the channel's whole filter

    [[nodiscard]] sample_index window_samples() const noexcept {
        return std::max<sample_index>(1, std::llround(window_s * rate_hz));
    }
    [[nodiscard]] sample_index skip_samples() const noexcept {
        const auto settle = static_cast<sample_index>(settle_samples);
        return 100 * settle > window_samples() ? settle : 0;
    }
    /// First sample of record `n` in its stretch; rounded anew for each, so that nothing
    /// accumulates.
    [[nodiscard]] sample_index first(sample_index n) const noexcept {
        return skip_samples() + std::llround(static_cast<double>(n) * every_s * rate_hz);
    }
    /// Centre of record `n` (of a periodic window), from the stretch's first sample.
    [[nodiscard]] double centre_s(sample_index n) const noexcept {
        return (static_cast<double>(first(n)) + 0.5 * static_cast<double>(window_samples())) /
               rate_hz;
    }
    /// Whether a stretch of `stretch_samples` holds record `n`.
    [[nodiscard]] bool holds(sample_index n, sample_index stretch_samples) const noexcept {
        return first(n) + window_samples() <= stretch_samples - skip_samples();
    }
    [[nodiscard]] sample_index records(sample_index stretch_samples) const noexcept {
        const double room =
            static_cast<double>(stretch_samples - 2 * skip_samples() - window_samples());
        auto n = std::max<sample_index>(0, static_cast<sample_index>(room / (every_s * rate_hz)));
        while (holds(n, stretch_samples)) {
            ++n;
        }
        return n > 0 && !holds(n - 1, stretch_samples) ? n - 1 : n;
    }
};

} // namespace tonewalk
