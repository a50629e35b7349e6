// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/base/allowed_errors.hpp"

#include <algorithm>
#include <array>
#include <cassert>

namespace tonewalk {
namespace {

constexpr auto table = std::to_array<allowed_error>({
    {"level_db.clean", "carrier and tone level", "peak 0 to -90 dBFS, cf32, no noise", "dB", 0.002},
    {"level_db.ci16_lsb", "carrier and tone level",
     "peak 0 to -90 dBFS, ci16 with 1 LSB rms noise; or u95 where that is more", "dB", 0.02},
    {"tone_mean_db.cn_minus3", "tone level, mean of linear power over 1000 records",
     "C/N -3 dB in 20 kHz, m 0.3, 0.2 s window", "dB", 0.1},
    {"tone_scatter_ratio.cn_minus3", "tone level, scatter over the bound sqrt(N0/T)",
     "C/N -3 dB in 20 kHz, m 0.3, 0.2 s window", "1", 1.35},
    {"datatype_carrier_db.8bit", "carrier level by sample format",
     "carrier -20 dBFS, m 0.3, 1 s at 48 kS/s, 8 bits with 1 LSB noise", "dB", 0.015},
    {"datatype_tone_db.8bit", "tone level by sample format",
     "carrier -20 dBFS, m 0.3, 1 s at 48 kS/s, 8 bits with 1 LSB noise", "dB", 0.06},
    {"datatype_carrier_db.16bit", "carrier level by sample format",
     "carrier -20 dBFS, m 0.3, 1 s at 48 kS/s, 16 bits and up", "dB", 0.001},
    {"datatype_tone_db.16bit", "tone level by sample format",
     "carrier -20 dBFS, m 0.3, 1 s at 48 kS/s, 16 bits and up", "dB", 0.003},
    {"frequency_ratio.cn_60", "carrier and tone frequency, rms error over the bound",
     "1 s, 60 dB C/N in 20 kHz", "1", 2.0},
    {"depth_percent.cn_60", "depth 1 to 99 %", "60 dB C/N in 20 kHz, 1 s", "% points", 0.005},
    {"depth_percent.cn_40", "depth 1 to 99 %", "40 dB C/N in 20 kHz, 1 s", "% points", 0.05},
    {"peak_percent.cn_60", "peaks 125/95 %", "60 dB C/N in 20 kHz", "% points", 0.05},
    {"peak_percent.overmodulated", "peaks, fold and pinch-off at 115 %",
     "60 dB C/N in 20 kHz, unmodulated lead-in", "% points", 0.5},
    {"thd_percent.cn_60", "THD 0.1 to 10 %, with incidental phase 0.05 rad too",
     "60 dB C/N in 20 kHz", "% points", 0.02},
    {"own_thd_db.ideal", "own floor of THD", "cf32 ideal transmitter, carrier off the tuning grid",
     "dB", -120.0},
    {"own_phase_rad.ideal", "own floor of incidental phase",
     "cf32 ideal transmitter, carrier off the tuning grid", "rad", 1e-6},
    {"own_residual_db.ideal", "own floor of residual noise",
     "cf32 ideal transmitter, carrier off the tuning grid", "dB", -115.0},
    {"own_residual_db.ci16", "residual noise",
     "ci16, 1 LSB rms dither a component, 2.4 MS/s, carrier -6 dBFS", "dB", -95.0},
    {"difference_of_depths.cn_60", "difference of depths 90/150 Hz, 1020 Hz and voice present",
     "60 dB C/N in 8 kHz, 1 s", "1", 0.00006},
    {"difference_of_depths.cn_40", "difference of depths 90/150 Hz, 1020 Hz and voice present",
     "40 dB C/N in 8 kHz, 10 s", "1", 0.0002},
    {"wavelength_percent.line", "wavelength",
     "10 wavelengths and more, 50 dB line SNR, 100 records, places to lambda/1000, 30 % uneven "
     "speed",
     "%", 0.2},
    {"swr_percent.to_10", "standing wave ratio to 10", "as wavelength_percent.line", "%", 2.0},
    {"swr_percent.30", "standing wave ratio 30", "as wavelength_percent.line", "%", 5.0},
    {"reflection_phase_deg.line", "phase of the reflection", "as wavelength_percent.line", "deg",
     2.0},
    {"null_bias_db", "null depth, mean error; each error within its interval",
     "sum of moving waves, SWR 10 and 30, null SNR 15 dB and more, window at most lambda/32 of "
     "travel",
     "dB", 0.5},
    {"tilt_deg", "tilt of the polarization", "ideal probe, 50 dB line SNR", "deg", 0.5},
    {"axial_ratio_db", "axial ratio 1 to 20 dB", "ideal probe, 50 dB line SNR", "dB", 0.2},
    {"beamwidth_deg.dipole", "beamwidth of a dipole pattern", "45 dB line SNR, 2 degree steps",
     "deg", 0.5},
    {"resonance_bandwidths.measured", "resonant frequency in bandwidths",
     "MAT-1, measured, stepped", "1", 0.03},
    {"resonance_q_percent.measured", "loaded Q", "MAT-1, measured, stepped", "%", 0.5},
    {"resonance_q_percent.leaky", "loaded Q", "MAT-4, measured, stepped, leaky and flagged", "%",
     2.0},
    {"two_modes_bandwidths", "resonant frequencies in bandwidths",
     "two modes one bandwidth apart, 1 : 0.8, coupling 0, 90, 180 degrees, 1 % power noise", "1",
     0.01},
    {"range_exponent", "exponent of the range law", "2 decades, 200 windows", "1", 0.03},
    {"coverage_percent.low", "intervals that hold the truth, least", "1000 seeds", "%", 93.0},
    {"coverage_percent.high", "intervals that hold the truth, most", "1000 seeds", "%", 97.0},
    {"coverage_percent.floor_low", "intervals that hold the truth, least",
     "1000 seeds, at the floor", "%", 93.0},
    {"coverage_percent.floor_high", "intervals that hold the truth, most",
     "1000 seeds, at the floor", "%", 98.5},
    {"coverage_percent.long_low", "intervals that hold the truth, least", "4000 seeds", "%", 94.0},
    {"coverage_percent.long_high", "intervals that hold the truth, most", "4000 seeds", "%", 96.0},
    {"coverage_tail_percent.long_low", "truth beyond one end, least", "4000 seeds", "%", 1.5},
    {"coverage_tail_percent.long_high", "truth beyond one end, most", "4000 seeds; or at the floor",
     "%", 3.5},
    {"u95_ratio", "u95 over 1.96 times the seeds' scatter, most", "every row with noise", "1", 1.5},
});

} // namespace

std::span<const allowed_error> allowed_errors() noexcept {
    return table;
}

double allowed(std::string_view key) noexcept {
    const auto* const row = std::find_if(
        table.begin(), table.end(), [key](const allowed_error& each) { return each.key == key; });
    assert(row != table.end());
    return row->allowed;
}

} // namespace tonewalk
