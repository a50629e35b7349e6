// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstdint>
#include <span>
#include <vector>

#include "tonewalk/base/random.hpp"
#include "tonewalk/base/sample.hpp"
#include "tonewalk/scene/scene.hpp"

namespace tonewalk {

/// Total gain of the steps at a time, dB; 0 before the first.
[[nodiscard]] double stepped_gain_db(const scene_receiver&, double time_s) noexcept;

/// From the field to the converter's input, sample by sample in order: noise, gain, compression, IQ
/// errors, DC, spurs, clipping.
class receiver_chain {
public:
    explicit receiver_chain(const scene&);
    void process(sample_index first_position, std::span<cf64> samples) noexcept;
    [[nodiscard]] double controlled_gain_db() const noexcept; ///< of the gain control, now

private:
    struct spur {
        double amplitude;
        std::uint64_t step, phase;
    };
    void add_noise(std::span<cf64>) noexcept;
    void step_gain(sample_index first, std::span<cf64>) noexcept;
    void control_gain(std::span<cf64>) noexcept;
    void distort(sample_index first, std::span<cf64>) noexcept;

    scene_receiver settings_;
    double rate_hz_;
    random_stream noise_;
    double noise_rms_;                                                       // of one component
    double gain_, least_gain_, most_gain_, target_power_, attack_, release_; // gain control
    double saturation_power_;                                                // compression: s^2
    double i_gain_, q_gain_, q_from_i_; // I' = i_gain I, Q' = q_gain Q + q_from_i I
    cf64 dc_;
    double clip_;
    std::vector<spur> spurs_;
};

} // namespace tonewalk
