// SPDX-License-Identifier: GPL-3.0-or-later
#include "propagation.hpp"

#include <cmath>
#include <utility>

#include "exact.hpp"

namespace tonewalk {

scene_motion::scene_motion(double begin, double speed, std::vector<scene_point> points)
    : begin_{begin}, speed_{speed}, curve_{std::move(points)} {}

double scene_motion::at(double time_s) noexcept {
    return curve_.empty() ? begin_ + speed_ * time_s : curve_.at(time_s);
}

scene_motion position_motion(const scene_path& path) {
    return {path.begin_m, path.speed_m_s, path.points};
}

scene_motion angle_motion(const scene_path& path) {
    return {path.begin_deg, path.rotation_deg_s, path.angles};
}

wave_sum::wave_sum(std::span<const scene_wave> waves, const scene_path& path, double wavelength_m)
    : position_{position_motion(path)} {
    for (const scene_wave& each : waves)
        waves_.push_back({each.amplitude,
                          unit_vector(phase_from_deg(each.direction_deg)).real() / wavelength_m,
                          phase_from_deg(each.phase_deg)});
}

cf64 wave_sum::at(double time_s) noexcept {
    const double position_m = position_.at(time_s);
    cf64 sum{};
    for (const wave& each : waves_)
        sum += each.amplitude *
               unit_vector(each.phase - phase_from_turns(position_m * each.turns_per_m));
    return sum;
}

common_factor::common_factor(const scene_carrier& carrier, const scene_path& path)
    : fades_{carrier.fades}, angle_{angle_motion(path)} {
    if (carrier.polarization) {
        const scene_polarization& field = *carrier.polarization;
        const double minor_to_major = amplitude_from_db(-field.axial_ratio_db);
        const double major = 1.0 / std::sqrt(1.0 + minor_to_major * minor_to_major);
        ellipse_ = ellipse{major, minor_to_major * major, field.tilt_deg,
                           amplitude_from_db(-field.isolation_db) *
                               unit_vector(phase_from_deg(field.isolation_phase_deg))};
    }
    if (carrier.pattern) {
        const double back_to_front = amplitude_from_db(-carrier.pattern->front_to_back_db);
        lobe_ = lobe{carrier.pattern->kind, carrier.pattern->bearing_deg,
                     (1.0 - back_to_front) / (1.0 + back_to_front)};
    }
}

bool common_factor::constant() const noexcept {
    return fades_.empty() && !((ellipse_ || lobe_) && angle_.moves());
}

cf64 common_factor::at(double time_s) noexcept {
    cf64 factor{fades_.empty() ? 1.0 : amplitude_from_db(fades_.at(time_s)), 0.0};
    if (!ellipse_ && !lobe_)
        return factor;
    const double angle_deg = angle_.at(time_s);
    if (ellipse_)
        factor = product(factor, probe(*ellipse_, angle_deg));
    if (lobe_)
        factor *= pattern(*lobe_, angle_deg);
    return factor;
}

cf64 common_factor::probe(const ellipse& field, double angle_deg) noexcept {
    const auto [sine, cosine] = exact_turn(phase_from_turns((angle_deg - field.tilt_deg) / 360.0));
    const cf64 wanted{field.major * cosine, field.minor * sine};
    const cf64 crossed{-field.major * sine, field.minor * cosine}; // a quarter turn on
    return wanted + product(field.leak, crossed);
}

double common_factor::pattern(const lobe& shape, double angle_deg) noexcept {
    const auto [sine, cosine] =
        exact_turn(phase_from_turns((angle_deg - shape.bearing_deg) / 360.0));
    if (shape.kind == scene_pattern::shape::cardioid)
        return (1.0 + shape.back * cosine) / (1.0 + shape.back);
    if (cosine < 1e-9 && cosine > -1e-9)
        return 0.0;                                                   // along the wire
    return exact_turn(phase_from_turns(0.25 * sine)).cosine / cosine; // cos(90 deg x sin a) / cos a
}

resonance::resonance(const scene_resonator& path)
    : leak_{path.leak * unit_vector(phase_from_deg(path.leak_phase_deg))} {
    for (const scene_mode& each : path.modes)
        modes_.push_back({each.frequency_hz, 2.0 * each.q_loaded / each.frequency_hz,
                          each.amplitude * unit_vector(phase_from_deg(each.phase_deg))});
}

cf64 resonance::at(double frequency_hz) const noexcept {
    cf64 sum = leak_;
    for (const mode& each : modes_) {
        const double x = each.steepness * (frequency_hz - each.frequency_hz);
        sum += product(each.strength, cf64{1.0, -x}) / (1.0 + x * x);
    }
    return sum;
}

} // namespace tonewalk
