// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cmath>
#include <optional>
#include <vector>

#include "line_spectrum.hpp"
#include "search_opening.hpp"
#include "tonewalk/channel/signal_search.hpp"

namespace tonewalk {

/// The neighbourhood of one frequency in detail: mixed to 0 Hz, decimated to 32 kS/s or a little
/// more, one transform over all that is looked at.
class close_look {
public:
    close_look(const looked_at&, double offset_hz);
    /// The strongest line within ±reach of the middle, at least 12 dB over the noise; Hz from the
    /// middle.
    [[nodiscard]] std::optional<double> strongest(double reach_hz) const;
    /// The carrier at `hz` from the middle, with its steady tones; a tone that was asked for is
    /// sought within 2 % (at least 2 Hz) and need not be steady.
    [[nodiscard]] found_carrier describe(double hz, std::optional<double> tone_hz) const;

private:
    struct pair {
        double hz = 0.0, weaker = 0.0, power = 0.0; // of both lines together
        [[nodiscard]] double depth(double carrier_power) const noexcept {
            return std::sqrt(2.0 * power / carrier_power);
        }
    };
    [[nodiscard]] std::vector<pair> pairs(double carrier_hz, double carrier_power, double low_hz,
                                          double high_hz) const;
    [[nodiscard]] std::optional<pair> pair_at(std::size_t upper_bin, double carrier_hz,
                                              double most_power) const;
    /// Takes out of `found`, strongest first, what is not steady.
    void keep_steady(std::vector<pair>& found, double carrier_hz, double carrier_power) const;
    [[nodiscard]] bool in_band(double hz) const noexcept;
    [[nodiscard]] double power_at(double hz) const; // amplitude^2 of a line there

    const stream_facts* facts_;
    double offset_hz_, band_low_hz_, band_high_hz_; // of the recording
    double rate_hz_ = 0.0;
    std::vector<cf32> samples_;
    std::optional<line_spectrum> spectrum_;
};

} // namespace tonewalk
