// SPDX-License-Identifier: GPL-3.0-or-later
#include "transmission.hpp"

#include <algorithm>
#include <cmath>

#include "exact.hpp"

namespace tonewalk {
namespace {

constexpr double two_pi = 6.283185307179586476925286766559;
constexpr std::uint64_t phase_walk_stream = 0x5057'0000'0000U;

/// Rms step per sample of a phase walk whose single-side density is `level_dbc_hz` at `offset_hz`:
/// the density of a walk growing by D rad^2/s is D/(2 pi f)^2.
double walk_step_turns(const scene_carrier& carrier, double rate_hz) noexcept {
    const double density_amplitude = amplitude_from_db(carrier.phase_noise_dbc_hz);
    return carrier.phase_noise_offset_hz * density_amplitude / std::sqrt(rate_hz);
}

} // namespace

frequency_course::frequency_course(const scene_carrier& carrier) noexcept
    : drift_hz_s_{carrier.drift_hz_s}, wobble_hz_{carrier.wobble_hz},
      wobble_period_s_{carrier.wobble_period_s} {}

double frequency_course::deviation_hz(double time_s) const noexcept {
    return drift_hz_s_ * time_s +
           wobble_hz_ * exact_turn(phase_from_turns(time_s / wobble_period_s_)).sine;
}

double frequency_course::turns(double time_s) const noexcept {
    const double swing = 1.0 - exact_turn(phase_from_turns(time_s / wobble_period_s_)).cosine;
    return 0.5 * drift_hz_s_ * time_s * time_s + wobble_hz_ * wobble_period_s_ / two_pi * swing;
}

phase_walk::phase_walk(const scene& whole, std::size_t carrier,
                       sample_index history_samples) noexcept
    : random_{whole.seed, phase_walk_stream + carrier},
      step_turns_{walk_step_turns(whole.carriers[carrier], whole.rate_hz)},
      after_{step_turns_ * random_.gaussian()}, index_{-history_samples} {}

double phase_walk::turns_at(double position) noexcept {
    const double whole = std::floor(position);
    for (const auto wanted = static_cast<sample_index>(whole); index_ < wanted; ++index_) {
        before_ = after_;
        after_ += step_turns_ * random_.gaussian();
    }
    return before_ + (after_ - before_) * (position - whole);
}

transmission::transmission(const scene& whole, std::size_t carrier, double delay_s,
                           double history_s)
    : rate_hz_{whole.rate_hz}, delay_s_{delay_s}, start_phase_{phase_from_deg(
                                                      whole.carriers[carrier].phase_deg)},
      on_{span_between(whole.carriers[carrier].start_s, whole.carriers[carrier].stop_s, delay_s,
                       whole.rate_hz)},
      course_{whole.carriers[carrier]}, modulation_{whole, carrier, delay_s} {
    if (whole.carriers[carrier].phase_noise_dbc_hz != scene_none)
        walk_.emplace(whole, carrier, sample_at(history_s, rate_hz_) + 1);
    if (whole.path.resonator) {
        resonance_.emplace(*whole.path.resonator);
        lines_ = modulation_lines(whole.carriers[carrier], rate_hz_, delay_s);
    }
}

void transmission::tune(double offset_hz, double frequency_hz) noexcept {
    frequency_hz_ = frequency_hz;
    step_ = phase_step(offset_hz, rate_hz_);
    phase_ = start_phase_ - phase_from_turns(offset_hz * delay_s_);
}

double transmission::time_s(sample_index position) const noexcept {
    return static_cast<double>(position) / rate_hz_ - delay_s_;
}

void transmission::render(sample_index first, std::span<cf64> out) {
    std::fill(out.begin(), out.end(), cf64{});
    const block_part on = part_of_block(on_, first, out.size());
    const std::span<cf64> sounding = out.subspan(on.begin, on.end - on.begin);
    const sample_index start = first + static_cast<sample_index>(on.begin);
    if (sounding.empty())
        return;
    if (resonance_) {
        shape_lines(start, sounding);
    } else {
        envelope_.resize(sounding.size());
        modulation_.envelope(start, envelope_);
        std::copy(envelope_.begin(), envelope_.end(), sounding.begin());
    }
    collect_turns(start, sounding.size());
    std::uint64_t phase = phase_ + step_ * static_cast<std::uint64_t>(start);
    for (std::size_t k = 0; k < sounding.size(); ++k, phase += step_) {
        const std::uint64_t moved = turns_.empty() ? phase : phase + phase_from_turns(turns_[k]);
        sounding[k] = product(sounding[k], unit_vector(moved));
    }
}

/// What turns the oscillator besides its steady step; nothing left in turns_ where nothing does.
void transmission::collect_turns(sample_index first, std::size_t count) {
    if (!course_.moves() && !walk_ && !modulation_.has_incidental())
        return;
    turns_.assign(count, 0.0);
    if (course_.moves())
        for (std::size_t k = 0; k < count; ++k)
            turns_[k] = course_.turns(time_s(first + static_cast<sample_index>(k)));
    if (walk_)
        for (std::size_t k = 0; k < count; ++k)
            turns_[k] += walk_->turns_at(static_cast<double>(first + static_cast<sample_index>(k)) -
                                         delay_s_ * rate_hz_);
    modulation_.add_incidental(first, turns_);
}

/// out = H(f0) + sum of depth/2 (H(f0 + f) e^(j a) + H(f0 - f) e^(-j a)), f0 the carrier's
/// frequency at that moment.
void transmission::shape_lines(sample_index first, std::span<cf64> out) noexcept {
    const auto frequency_at = [&](sample_index position) {
        return course_.moves() ? frequency_hz_ + course_.deviation_hz(time_s(position))
                               : frequency_hz_;
    };
    cf64 carrier = resonance_->at(frequency_at(first));
    for (std::size_t k = 0; k < out.size(); ++k) {
        if (course_.moves())
            carrier = resonance_->at(frequency_at(first + static_cast<sample_index>(k)));
        out[k] = carrier;
    }
    for (const modulation_line& line : lines_) {
        const block_part on = part_of_block(line.on, first, out.size());
        sample_index position = first + static_cast<sample_index>(on.begin);
        cf64 above{}, below{};
        for (std::size_t k = on.begin; k < on.end; ++k, ++position) {
            if (k == on.begin || course_.moves()) {
                const double centre_hz = frequency_at(position);
                above = 0.5 * line.depth * resonance_->at(centre_hz + line.frequency_hz);
                below = 0.5 * line.depth * resonance_->at(centre_hz - line.frequency_hz);
            }
            const cf64 turned = unit_vector(line.phase_at(position));
            out[k] += product(above, turned) + product(below, std::conj(turned));
        }
    }
}

} // namespace tonewalk
