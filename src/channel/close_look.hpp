// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <optional>
#include <span>
#include <vector>

#include "line_spectrum.hpp"
#include "tonewalk/channel/signal_search.hpp"
#include "tonewalk/recording/convert.hpp"

namespace tonewalk {

/// Stored frames that are looked at, of one stretch.
struct looked_at {
    std::span<const std::byte> bytes;
    std::size_t frames = 0;
    const stream_facts* facts = nullptr;
    const sample_converter* converter = nullptr;
};

/// The neighbourhood of one frequency in detail: mixed to 0 Hz, decimated to some 32 kS/s, one
/// transform over all that is looked at.
class close_look {
public:
    close_look(const looked_at&, double offset_hz);
    /// The strongest line within ±reach of the middle, at least 12 dB over the noise; Hz from the
    /// middle.
    [[nodiscard]] std::optional<double> strongest(double reach_hz) const;
    /// The carrier at `hz` from the middle, with its steady tones; `tone_hz` narrows the choice.
    [[nodiscard]] found_carrier describe(double hz, std::optional<double> tone_hz) const;
    [[nodiscard]] double power_at(double hz) const; ///< amplitude^2 of a line there

private:
    struct pair {
        double hz = 0.0, weaker = 0.0, power = 0.0; // of both lines together
    };
    [[nodiscard]] std::vector<pair> pairs(double carrier_hz, double low_hz, double high_hz) const;
    [[nodiscard]] bool steady(double carrier_hz, const pair&) const;
    [[nodiscard]] bool in_band(double hz) const noexcept;
    [[nodiscard]] cf64 correlate(double hz, std::size_t first, std::size_t count) const;

    double offset_hz_, band_low_hz_, band_high_hz_; // of the recording
    double rate_hz_ = 0.0;
    std::vector<cf32> samples_;
    std::optional<line_spectrum> spectrum_;
};

} // namespace tonewalk
