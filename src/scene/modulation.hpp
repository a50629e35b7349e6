// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstdint>
#include <optional>
#include <span>
#include <vector>

#include "speech.hpp"
#include "timing.hpp"
#include "tonewalk/base/sample.hpp"
#include "tonewalk/scene/scene.hpp"

namespace tonewalk {

/// One cosine of the modulating waveform, as an oscillator over positions.
struct modulation_line {
    double frequency_hz = 0.0;
    double depth = 0.0;                ///< amplitude relative to the carrier
    std::uint64_t step = 0, phase = 0; ///< phase at position 0
    position_span on;

    [[nodiscard]] std::uint64_t phase_at(sample_index position) const noexcept {
        return phase + step * static_cast<std::uint64_t>(position);
    }
};

/// A carrier's tones with their harmonics, and its hum, `delay_s` late.
[[nodiscard]] std::vector<modulation_line> modulation_lines(const scene_carrier&, double rate_hz,
                                                            double delay_s);

/// The modulating waveform of one carrier.
class modulation {
public:
    modulation(const scene&, std::size_t carrier, double delay_s);
    /// out[i] = envelope relative to the unmodulated carrier at position first + i: signed where
    /// the carrier folds, never negative where it is pinched off.
    void envelope(sample_index first, std::span<double> out) noexcept;
    /// Adds the incidental phase, in turns.
    void add_incidental(sample_index first, std::span<double> turns) const noexcept;
    [[nodiscard]] bool has_incidental() const noexcept { return !incidental_.empty(); }

private:
    std::vector<modulation_line> lines_, incidental_; // depth of incidental_: turns
    std::optional<speech_like> speech_;
    double speech_depth_, rate_hz_, delay_s_;
    bool pinched_;
};

} // namespace tonewalk
