// SPDX-License-Identifier: GPL-3.0-or-later
#include "receiver.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

#include "exact.hpp"
#include "timing.hpp"

namespace tonewalk {
namespace {

constexpr std::uint64_t noise_stream = 1;
constexpr double most_excess = 8.0; // how far one sample may pull the gain control

/// White over the recorded band: rate wide for complex samples; half of that, and one component of
/// the analytic signal, for real ones. Both give the same rms per Hz of what is later taken as
/// analytic.
double component_noise_rms(const scene& whole) noexcept {
    const double band_hz = whole.format.is_complex ? whole.rate_hz : whole.rate_hz / 2.0;
    return amplitude_from_db(whole.receiver.noise_dbfs_hz) * std::sqrt(band_hz / 2.0);
}

/// A level that comes out 1 dB low: 1 + r^2/s^2 = 10^0.1.
double saturation_power(double compression_dbfs) noexcept {
    if (std::isinf(compression_dbfs))
        return std::numeric_limits<double>::infinity();
    const double amplitude = amplitude_from_db(compression_dbfs);
    const double one_db = amplitude_from_db(2.0) - 1.0;
    return amplitude * amplitude / one_db;
}

double amplitude_or_infinity(double db) noexcept {
    return std::isinf(db) ? std::numeric_limits<double>::infinity() : amplitude_from_db(db);
}

} // namespace

double stepped_gain_db(const scene_receiver& receiver, double time_s) noexcept {
    double gain_db = 0.0;
    for (const scene_gain_step& step : receiver.gain_steps)
        if (step.time_s <= time_s)
            gain_db = step.gain_db;
    return gain_db;
}

receiver_chain::receiver_chain(const scene& whole)
    : settings_{whole.receiver}, rate_hz_{whole.rate_hz}, noise_{whole.seed, noise_stream},
      noise_rms_{component_noise_rms(whole)}, saturation_power_{saturation_power(
                                                  whole.receiver.compression_dbfs)},
      dc_{amplitude_from_db(whole.receiver.dc_dbfs) *
          unit_vector(phase_from_deg(whole.receiver.dc_phase_deg))},
      clip_{amplitude_or_infinity(whole.receiver.clip_dbfs)} {
    const scene_gain_control control = settings_.gain_control.value_or(scene_gain_control{});
    gain_ = amplitude_from_db(control.begin_db);
    least_gain_ = amplitude_from_db(control.least_db);
    most_gain_ = amplitude_from_db(control.most_db);
    target_power_ = amplitude_from_db(2.0 * control.target_dbfs);
    attack_ = 0.5 / (control.attack_s * rate_hz_);
    release_ = 0.5 / (control.release_s * rate_hz_);
    const double gain =
        amplitude_from_db(settings_.iq_gain_error_db / 2.0); // gI = gain, gQ = 1/gain
    const cf64 skew = unit_vector(phase_from_deg(settings_.iq_phase_error_deg));
    const double wanted =
        magnitude(cf64{gain, 0.0} + skew / gain) / 2.0; // what the line would become
    i_gain_ = gain / wanted;
    q_gain_ = skew.real() / gain / wanted;
    q_from_i_ = skew.imag() / gain / wanted;
    for (const scene_spur& each : settings_.spurs)
        spurs_.push_back({amplitude_from_db(each.level_dbfs), phase_step(each.offset_hz, rate_hz_),
                          phase_from_deg(each.phase_deg)});
}

double receiver_chain::controlled_gain_db() const noexcept {
    return settings_.gain_control ? db_from_amplitude(gain_) : 0.0;
}

void receiver_chain::process(sample_index first_position, std::span<cf64> samples) noexcept {
    if (noise_rms_ > 0.0)
        add_noise(samples);
    if (!settings_.gain_steps.empty())
        step_gain(first_position, samples);
    if (settings_.gain_control)
        control_gain(samples);
    distort(first_position, samples);
}

void receiver_chain::add_noise(std::span<cf64> samples) noexcept {
    for (cf64& z : samples) {
        const double in_phase = noise_.gaussian();
        z += noise_rms_ * cf64{in_phase, noise_.gaussian()};
    }
}

void receiver_chain::step_gain(sample_index first, std::span<cf64> samples) noexcept {
    const auto& steps = settings_.gain_steps;
    for (std::size_t k = 0; k < steps.size(); ++k) {
        const double until_s = k + 1 < steps.size() ? steps[k + 1].time_s : scene_never;
        const block_part on = part_of_block(span_between(steps[k].time_s, until_s, 0.0, rate_hz_),
                                            first, samples.size());
        const double gain = amplitude_from_db(steps[k].gain_db);
        for (cf64& z : samples.subspan(on.begin, on.end - on.begin))
            z *= gain;
    }
}

/// The logarithm of the gain follows half the relative excess of power, so that near the target an
/// error dies away with the time constant.
void receiver_chain::control_gain(std::span<cf64> samples) noexcept {
    for (cf64& z : samples) {
        z *= gain_;
        const double excess = std::min(squared_magnitude(z) / target_power_ - 1.0, most_excess);
        gain_ *= 1.0 - (excess > 0.0 ? attack_ : release_) * excess;
        gain_ = std::clamp(gain_, least_gain_, most_gain_);
    }
}

void receiver_chain::distort(sample_index first, std::span<cf64> samples) noexcept {
    if (!std::isinf(saturation_power_))
        for (cf64& z : samples)
            z /= std::sqrt(1.0 + squared_magnitude(z) / saturation_power_);
    if (settings_.iq_gain_error_db != 0.0 || settings_.iq_phase_error_deg != 0.0)
        for (cf64& z : samples)
            z = {i_gain_ * z.real(), q_gain_ * z.imag() + q_from_i_ * z.real()};
    if (dc_ != cf64{})
        for (cf64& z : samples)
            z += dc_;
    for (const spur& line : spurs_) {
        std::uint64_t phase = line.phase + line.step * static_cast<std::uint64_t>(first);
        for (cf64& z : samples) {
            z += line.amplitude * unit_vector(phase);
            phase += line.step;
        }
    }
    if (!std::isinf(clip_))
        for (cf64& z : samples)
            z = {std::clamp(z.real(), -clip_, clip_), std::clamp(z.imag(), -clip_, clip_)};
}

} // namespace tonewalk
