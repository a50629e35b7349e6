// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <optional>
#include <span>
#include <vector>

#include "tonewalk/base/sample.hpp"
#include "tonewalk/channel/signal_search.hpp"

namespace tonewalk {

/// A carrier's neighbourhood cut into short parts (Hann windows), in each of which lines are
/// compared with the carrier of that very part: fades, drift and wobble touch both alike.
class carrier_parts {
public:
    /// `part_s` long each, or half of what there is.
    carrier_parts(std::span<const cf32> samples, double rate_hz, double carrier_hz, double part_s);

    /// The tone's frequency, refined where its phase turns (at most one bin of all parts
    /// together), if depth and phase then agree for some 1 s (a shorter opening: throughout) at
    /// half its mean `depth` (1: 100 %) or more. `noise_density`: full scale^2 per Hz. `tone_hz` at
    /// least 5 / part_s.
    [[nodiscard]] std::optional<double> steady_tone(double tone_hz, double depth,
                                                    double noise_density) const;

    /// Whether the lines between `low_hz` and `high_hz` are in step with the carrier, as amplitude
    /// modulation is and noise, phase noise or another carrier is not; `tones` left out.
    [[nodiscard]] bool in_step(double low_hz, double high_hz,
                               std::span<const found_tone> tones) const;

private:
    /// Of one part, times the carrier's power: in step with the carrier, and in quadrature.
    struct sidebands {
        cf64 in_step, quadrature;
    };
    [[nodiscard]] std::vector<sidebands> sidebands_at(double tone_hz) const;
    /// Takes the turning of a tone that is slightly off out of its sidebands; turns a part.
    [[nodiscard]] double straighten(std::span<sidebands> tone) const;
    [[nodiscard]] bool agree(std::span<const sidebands> tone, double depth, double noise) const;
    [[nodiscard]] std::span<const cf32> part(std::size_t k) const noexcept;

    double rate_hz_;
    std::size_t size_ = 0, count_ = 0;
    std::vector<cf32> windowed_; // the carrier at 0 Hz; lines read size() times their amplitude
    std::vector<cf64> carrier_;  // of each part
};

} // namespace tonewalk
