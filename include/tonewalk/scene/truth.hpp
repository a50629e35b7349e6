// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <memory>
#include <string>
#include <vector>

#include "tonewalk/base/sample.hpp"
#include "tonewalk/scene/scene.hpp"

namespace tonewalk {

/// What stands in the signal at one moment. Amplitudes: full scale = 1.0, receiver gain steps
/// included; gain control, compression and clipping not.
struct carrier_truth {
    bool on = false;        ///< on the air and inside the recorded band
    cf64 field{};           ///< waves, polarization, pattern, fades, resonator at the carrier
    double offset_hz = 0.0; ///< from the centre then; drift and wobble included, Doppler not
    double carrier_amplitude = 0.0; ///< unmodulated carrier; 0 when off
    /// The carrier line while modulated: lower by incidental phase, higher when pinched off; NaN
    /// where several tones are pinched off together.
    double line_amplitude = 0.0;
    /// Of each tone in the demodulated envelope; 0 when not sounding, NaN as above.
    std::vector<double> tone_amplitudes;
};

/// Expected values of a scene in closed form, shared by truth.json and by tests. Not for several
/// threads at once.
class scene_truth {
public:
    explicit scene_truth(const scene&); ///< copies; throws like check_scene()
    scene_truth(scene_truth&&) noexcept;
    scene_truth& operator=(scene_truth&&) noexcept;
    ~scene_truth();

    /// Tones of incommensurate frequencies are assumed where several carry incidental phase.
    [[nodiscard]] carrier_truth at(std::size_t carrier, double time_s) const;
    /// Hann-weighted mean over [start, start + window) of the complex carrier line: what a line
    /// meter with that window reads when it follows the oscillator (drift, wobble) exactly.
    [[nodiscard]] cf64 mean_carrier(std::size_t carrier, double start_s, double window_s) const;
    /// Peaks and nulls of the unmodulated carrier against time: turns of 3 dB and more, found on
    /// the truth grid and refined.
    struct extremum {
        bool is_peak = false;
        double time_s = 0.0, level_dbfs = 0.0;
    };
    [[nodiscard]] std::vector<extremum> extrema(std::size_t carrier) const;

private:
    struct state;
    std::unique_ptr<state> state_;
};

[[nodiscard]] carrier_truth truth_at(const scene&, std::size_t carrier, double time_s);

} // namespace tonewalk
