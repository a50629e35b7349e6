// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstdint>
#include <optional>
#include <span>
#include <vector>

#include "modulation.hpp"
#include "propagation.hpp"
#include "tonewalk/base/random.hpp"
#include "tonewalk/base/sample.hpp"
#include "tonewalk/scene/scene.hpp"

namespace tonewalk {

/// How a carrier's frequency moves about its nominal value.
class frequency_course {
public:
    explicit frequency_course(const scene_carrier&) noexcept;
    [[nodiscard]] bool moves() const noexcept { return drift_hz_s_ != 0.0 || wobble_hz_ != 0.0; }
    [[nodiscard]] double deviation_hz(double time_s) const noexcept;
    [[nodiscard]] double turns(double time_s) const noexcept; ///< the deviation's integral from 0

private:
    double drift_hz_s_, wobble_hz_, wobble_period_s_;
};

/// A random walk of the phase, straight between samples. Positions must ascend.
class phase_walk {
public:
    /// Starts `history_samples` before position 0.
    phase_walk(const scene&, std::size_t carrier, sample_index history_samples) noexcept;
    [[nodiscard]] double turns_at(double position) noexcept;

private:
    random_stream random_;
    double step_turns_; // rms
    double before_ = 0.0, after_;
    sample_index index_; // of before_
};

/// A carrier as it left the transmitter `delay_s` ago: oscillator and modulation, full scale = 1
/// for an unmodulated carrier of 0 dB. With a resonator each of its lines is shaped by that.
class transmission {
public:
    /// `history_s`: the longest delay of this carrier's waves, so that all see one phase walk.
    transmission(const scene&, std::size_t carrier, double delay_s, double history_s);
    /// Where the carrier stands now: from the centre, and absolutely (0 where no centre is known).
    void tune(double offset_hz, double frequency_hz) noexcept;
    /// out[i] at position first + i; zero where off the air. Blocks ascend.
    void render(sample_index first, std::span<cf64> out);

private:
    void collect_turns(sample_index first, std::size_t count);
    void shape_lines(sample_index first, std::span<cf64> out) noexcept;
    [[nodiscard]] double time_s(sample_index position) const noexcept;

    double rate_hz_, delay_s_;
    std::uint64_t start_phase_;
    position_span on_;
    frequency_course course_;
    std::optional<phase_walk> walk_;
    modulation modulation_;
    std::vector<modulation_line> lines_; // for the resonator
    std::optional<resonance> resonance_;
    double frequency_hz_ = 0.0;
    std::uint64_t step_ = 0, phase_ = 0;
    std::vector<double> envelope_, turns_; // scratch
};

} // namespace tonewalk
