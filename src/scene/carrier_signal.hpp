// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <span>
#include <vector>

#include "propagation.hpp"
#include "transmission.hpp"
#include "tuning.hpp"

namespace tonewalk {

/// Waves that share a delay.
struct wave_group {
    double delay_s = 0.0;
    std::vector<scene_wave> waves;
};
/// At least one; the single still wave of a carrier that names none.
[[nodiscard]] std::vector<wave_group> wave_groups(const scene_carrier&);
[[nodiscard]] double longest_delay_s(const scene_carrier&);

/// Wavelength at an absolute frequency; infinite where that is not known.
[[nodiscard]] double wavelength_m(double frequency_hz) noexcept;

/// One carrier as it reaches the receiver.
class carrier_signal {
public:
    carrier_signal(const scene&, std::size_t carrier);
    void tune(const carrier_tuning&);
    /// Adds to out[i] what arrives at position first + i. Blocks ascend.
    void add(sample_index first, std::span<cf64> out);

private:
    struct arrival {
        transmission sent;
        std::vector<scene_wave> waves;
        wave_sum sum;
    };
    void add_arrival(arrival&, sample_index first, std::span<cf64> out);

    scene_path path_;
    double rate_hz_, amplitude_;
    std::vector<arrival> arrivals_;
    common_factor common_;
    std::vector<cf64> factor_, received_; // scratch
};

} // namespace tonewalk
