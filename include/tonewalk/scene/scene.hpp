// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstdint>
#include <limits>
#include <optional>
#include <string>
#include <vector>

#include "tonewalk/base/sample.hpp"
#include "tonewalk/base/time.hpp"
#include "tonewalk/recording/sample_format.hpp"

namespace tonewalk {

/// A synthetic recording with known truth, as plain values; the same keys as scene.toml
/// (docs/jobs/make.md). Fill it in C++ with designated initialisers, or read_scene() it.
///
/// Times count from the recording's first sample, lost samples included. Levels follow the design:
/// 0 dBFS is a complex magnitude of 1 and equally a real sine of amplitude 1. Phases are those at
/// time 0, of a cosine.

inline constexpr double scene_never = std::numeric_limits<double>::infinity();  ///< a time
inline constexpr double scene_none = -std::numeric_limits<double>::infinity();  ///< a level
inline constexpr double scene_beyond = std::numeric_limits<double>::infinity(); ///< a limit

/// A point of a curve that is straight between its points and level beyond its ends.
struct scene_point {
    double time_s = 0.0;
    double value = 0.0; ///< unit as the field that holds it says
};

/// A multiple of a tone in the modulation: percent of the tone's own depth.
struct scene_harmonic {
    unsigned order = 2;
    double percent = 0.0;
    double phase_deg = 0.0; ///< added to order x the tone's phase
};

/// A modulating tone: depth cos(2 pi f t + phase) is added to the envelope 1.
struct scene_tone {
    double frequency_hz = 1000.0;
    double depth_percent = 30.0;
    double phase_deg = 0.0;
    double start_s = scene_none, stop_s = scene_never; ///< sounds in [start, stop)
    double incidental_rad = 0.0;       ///< peak phase deviation of the carrier by this tone
    double incidental_phase_deg = 0.0; ///< added to the tone's phase
    std::vector<scene_harmonic> harmonics{};
};

/// Ripple of the supply in the envelope: the mains frequency's multiple that is named.
struct scene_hum {
    double frequency_hz = 100.0;
    double depth_percent = 0.0;
    double phase_deg = 0.0;
};

/// A plane wave that reaches the moving point, carrying the whole modulated signal `delay_s` late.
/// Its phase is phase_deg - 360 x cos(direction) / wavelength: direction 0 travels along with the
/// walk, 180 comes towards it. phase_deg holds at position 0, at the carrier, for a delay of 0.
struct scene_wave {
    double amplitude = 1.0;
    double phase_deg = 0.0;
    double direction_deg = 0.0;
    double delay_s = 0.0;
};

/// An elliptical field of total power 1, seen by a linear probe at the path's angle a: with
/// semi-axes A, B (A/B the axial ratio) the probe receives A cos(a - tilt) + j B sin(a - tilt),
/// plus the same a quarter turn on, reduced by its own isolation.
struct scene_polarization {
    double axial_ratio_db = scene_beyond; ///< beyond: linear
    double tilt_deg = 0.0;
    double isolation_db = scene_beyond; ///< of the probe; beyond: ideal
    double isolation_phase_deg = 0.0;
};

/// An antenna pattern seen while turning about a mast, relative to its peak at `bearing_deg`.
struct scene_pattern {
    enum class shape { half_wave, cardioid };
    shape kind = shape::half_wave;
    double bearing_deg = 0.0;
    double front_to_back_db = scene_beyond; ///< cardioid: (1 + b cos a)/(1 + b); beyond: b = 1
};

enum class overmodulation {
    fold,     ///< ideal multiplier: the carrier turns over where the waveform is negative
    pinch_off ///< real transmitter: no carrier there
};

struct scene_carrier {
    double offset_hz = 0.0;      ///< from the recording's centre
    bool follows_centre = false; ///< keeps its offset when a segment has another centre
    double level_dbfs = -6.0;    ///< of the unmodulated carrier, before path and fades
    double phase_deg = 0.0;
    double drift_hz_s = 0.0;
    double wobble_hz = 0.0; ///< peak of a sinusoidal frequency deviation, zero and rising at time 0
    double wobble_period_s = 1.0;
    double phase_noise_dbc_hz =
        scene_none; ///< single side, falling as 1/f^2 (white frequency noise)
    double phase_noise_offset_hz = 1000.0;             ///< where that density holds
    double start_s = scene_none, stop_s = scene_never; ///< on the air in [start, stop)
    enum overmodulation overmodulation = overmodulation::fold;
    double speech_percent = 0.0; ///< peak depth of speech-like modulation (no line steady for 1 s)
    std::vector<scene_tone> tones{};
    std::vector<scene_hum> hum{};
    std::vector<scene_wave> waves{};  ///< none: one wave of amplitude 1 that does not move
    std::vector<scene_point> fades{}; ///< dB added to the level
    std::optional<scene_polarization> polarization{};
    std::optional<scene_pattern> pattern{};
};

/// One pole of the path: amplitude e^(j phase) / (1 + j 2 Q (f - f0)/f0).
struct scene_mode {
    double frequency_hz = 0.0; ///< absolute
    double q_loaded = 100.0;
    double amplitude = 1.0;
    double phase_deg = 0.0;
};

/// leak e^(j phase) + the sum of the modes, applied to the carrier and to each sideband line.
struct scene_resonator {
    double leak = 0.0;
    double leak_phase_deg = 0.0;
    std::vector<scene_mode> modes{};
};

/// Where the receiving point is: position for the waves, angle for polarization and pattern.
struct scene_path {
    double speed_m_s = 0.0, begin_m = 0.0;
    std::vector<scene_point> points{}; ///< metres; when given, instead of the speed
    double rotation_deg_s = 0.0, begin_deg = 0.0;
    std::vector<scene_point> angles{}; ///< degrees; when given, instead of the rotation
    std::optional<scene_resonator> resonator{};
};

/// From `time_s` on, the gain before the converter is `gain_db` (signal and noise alike).
struct scene_gain_step {
    double time_s = 0.0;
    double gain_db = 0.0;
};

/// Automatic gain control, feedback: holds the output's power at the target. It starts from
/// begin_db at time 0 and waits during gaps.
struct scene_gain_control {
    double target_dbfs = -20.0;
    double attack_s = 0.01; ///< time constant while the output is too strong
    double release_s = 0.3; ///< while it is too weak
    double least_db = -60.0, most_db = 60.0;
    double begin_db = 0.0;
};

/// A steady line that arises in the converter, after every gain.
struct scene_spur {
    double offset_hz = 0.0;
    double level_dbfs = -60.0;
    double phase_deg = 0.0;
};

/// Lost samples: the time line runs on, nothing is stored. `samples` wins over `duration_s`.
struct scene_gap {
    double start_s = 0.0;
    double duration_s = 0.0;
    sample_index samples = 0;
};

/// Stored samples [first, first + count) replaced; float formats only.
struct scene_non_finite {
    enum class kind { nan, infinity, minus_infinity };
    sample_index first = 0;
    sample_index count = 1;
    kind value = kind::nan;
};

/// In the order in which the signal meets them: noise, gain, compression, IQ errors, DC, spurs,
/// clipping, converter noise, rounding.
struct scene_receiver {
    double noise_dbfs_hz = scene_none; ///< density, white over the recorded band
    std::vector<scene_gain_step> gain_steps{};
    std::optional<scene_gain_control> gain_control{};
    double compression_dbfs = scene_beyond; ///< level that comes out 1 dB low; r/sqrt(1 + r^2/s^2)
    double iq_gain_error_db = 0.0;          ///< 20 log gI/gQ; the wanted line keeps its level
    double iq_phase_error_deg = 0.0;        ///< e in I = cos, Q = sin(wt + e); the image follows
    double dc_dbfs = scene_none;
    double dc_phase_deg = 45.0; ///< 0: all on I
    std::vector<scene_spur> spurs{};
    double clip_dbfs = scene_beyond; ///< of each component; integers end at their own codes anyway
    double noise_lsb_rms = 0.0;      ///< added to each component before rounding; integers only
    std::vector<scene_gap> gaps{};
    std::vector<scene_non_finite> non_finite{};
};

/// A segment with its own centre or clock. `samples` wins over `duration_s`.
struct scene_segment {
    double duration_s = 0.0;
    sample_index samples = 0;
    double lost_s = 0.0;                 ///< lost before it
    std::optional<double> centre_hz{};   ///< absent: the recording's
    std::optional<utc_time> start_utc{}; ///< absent: from the recording's start and the position
};

struct scene {
    sample_format format{}; ///< ci16_le
    double rate_hz = 48000.0;
    std::optional<double> centre_hz{};
    std::optional<utc_time> start_utc{};
    double duration_s = 1.0;               ///< of stored samples
    sample_index samples = 0;              ///< exact length; above 0 it wins over duration_s
    std::vector<scene_segment> segments{}; ///< when given, they set the length
    std::uint64_t seed = 1;
    double truth_every_s = 0.01; ///< grid of the truth's level series
    std::string description{};
    std::vector<scene_carrier> carriers{};
    scene_path path{};
    scene_receiver receiver{};
};

/// Stored samples without a break: [first, first + count) of the file, `position` on the time line.
struct scene_stretch {
    sample_index first = 0, position = 0, count = 0;
    std::optional<double> centre_hz;
    std::optional<utc_time> start_utc; ///< of its first sample
};
[[nodiscard]] std::vector<scene_stretch> scene_layout(const scene&);
[[nodiscard]] sample_index stored_samples(const scene&);

/// Throws error{malformed} at the first value that cannot be made; `where` begins its line.
void check_scene(const scene&, const std::string& where);

} // namespace tonewalk
