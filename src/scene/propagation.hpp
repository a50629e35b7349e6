// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <optional>
#include <span>
#include <vector>

#include "timing.hpp"
#include "tonewalk/base/sample.hpp"
#include "tonewalk/scene/scene.hpp"

namespace tonewalk {

/// The receiving point's position or angle against time.
class scene_motion {
public:
    scene_motion(double begin, double speed, std::vector<scene_point> points);
    [[nodiscard]] double at(double time_s) noexcept;
    [[nodiscard]] bool moves() const noexcept { return !curve_.empty() || speed_ != 0.0; }

private:
    double begin_, speed_;
    scene_curve curve_;
};
[[nodiscard]] scene_motion position_motion(const scene_path&); ///< metres
[[nodiscard]] scene_motion angle_motion(const scene_path&);    ///< degrees

/// Waves with one delay: the complex sum of their amplitudes at the moving point.
class wave_sum {
public:
    /// `wavelength_m` at the carrier; infinite where no centre is known and nothing moves.
    wave_sum(std::span<const scene_wave>, const scene_path&, double wavelength_m);
    [[nodiscard]] cf64 at(double time_s) noexcept;
    [[nodiscard]] bool constant() const noexcept { return !position_.moves(); }

private:
    struct wave {
        double amplitude, turns_per_m;
        std::uint64_t phase;
    };
    std::vector<wave> waves_;
    scene_motion position_;
};

/// What multiplies all waves of a carrier alike: fades, polarization, pattern.
class common_factor {
public:
    common_factor(const scene_carrier&, const scene_path&);
    [[nodiscard]] cf64 at(double time_s) noexcept;
    [[nodiscard]] bool constant() const noexcept;

private:
    struct ellipse {
        double major, minor; ///< semi-axes, major^2 + minor^2 = 1
        double tilt_deg;
        cf64 leak; ///< of the probe's other polarization
    };
    struct lobe {
        scene_pattern::shape kind;
        double bearing_deg, back; ///< back: weight of the cosine
    };
    [[nodiscard]] static cf64 probe(const ellipse&, double angle_deg) noexcept;
    [[nodiscard]] static double pattern(const lobe&, double angle_deg) noexcept;

    std::optional<ellipse> ellipse_;
    std::optional<lobe> lobe_;
    scene_curve fades_;
    scene_motion angle_;
};

/// Response of the path's poles at an absolute frequency.
class resonance {
public:
    explicit resonance(const scene_resonator&);
    [[nodiscard]] cf64 at(double frequency_hz) const noexcept;

private:
    struct mode {
        double frequency_hz, steepness; ///< 2 Q / f0
        cf64 strength;
    };
    cf64 leak_;
    std::vector<mode> modes_;
};

} // namespace tonewalk
