// SPDX-License-Identifier: GPL-3.0-or-later
#include "speech.hpp"

#include <cmath>
#include <limits>

#include "exact.hpp"

namespace tonewalk {
namespace {

constexpr double pause_share = 0.15;

/// A resonance's weight at a frequency, 1 at its middle.
double resonance_weight(double frequency_hz, double middle_hz, double half_width_hz) noexcept {
    const double x = (frequency_hz - middle_hz) / half_width_hz;
    return 1.0 / (1.0 + x * x);
}

} // namespace

speech_like::speech_like(std::uint64_t seed, std::uint64_t voice) noexcept
    : seed_{seed}, voice_{voice}, slot_{std::numeric_limits<std::int64_t>::min()} {}

void speech_like::enter(std::int64_t slot) noexcept {
    slot_ = slot;
    random_stream draw{seed_ ^ (voice_ << 48U), static_cast<std::uint64_t>(slot)};
    now_ = {};
    if (draw.uniform() < pause_share)
        return;
    now_.length_s = draw.uniform(0.10, 0.18);
    now_.start_s = draw.uniform(0.0, slot_s - now_.length_s);
    now_.pitch_hz = draw.uniform(100.0, 210.0);
    // A third of the pitch up or down at most, a tenth at least: every harmonic moves.
    const double glide = draw.uniform(0.1, 0.33) * (draw.uniform() < 0.5 ? -1.0 : 1.0);
    now_.glide_hz_s = glide * now_.pitch_hz / now_.length_s;
    shape(draw);
}

void speech_like::shape(random_stream& draw) noexcept {
    const double first_hz = draw.uniform(300.0, 800.0), second_hz = draw.uniform(900.0, 2300.0);
    const double loudness = draw.uniform(0.5, 1.0);
    const double top_hz = now_.pitch_hz * 1.33;
    double total = 0.0;
    for (double multiple = 1.0; multiple * top_hz < highest_hz && now_.partials < most_partials;
         multiple += 1.0) {
        const double at_hz = multiple * now_.pitch_hz;
        const double weight = 0.01 + resonance_weight(at_hz, first_hz, 120.0) +
                              0.5 * resonance_weight(at_hz, second_hz, 180.0);
        now_.weights[now_.partials++] = weight;
        total += weight;
    }
    for (double& weight : now_.weights)
        weight *= loudness / total;
}

double speech_like::at(double time_s) noexcept {
    const auto slot = static_cast<std::int64_t>(std::floor(time_s / slot_s));
    if (slot != slot_)
        enter(slot);
    const double since_s = time_s - static_cast<double>(slot) * slot_s - now_.start_s;
    if (since_s < 0.0 || since_s >= now_.length_s)
        return 0.0;
    const double turns = (now_.pitch_hz + 0.5 * now_.glide_hz_s * since_s) * since_s;
    const double cosine = exact_turn(phase_from_turns(turns)).cosine;
    double before = 1.0, here = cosine,
           sum = 0.0; // cos 0, cos x; cos (n+1)x = 2 cos x cos nx - cos (n-1)x
    for (std::size_t k = 0; k < now_.partials; ++k) {
        sum += now_.weights[k] * here;
        const double after = 2.0 * cosine * here - before;
        before = here;
        here = after;
    }
    const double swell = exact_turn(phase_from_turns(0.5 * since_s / now_.length_s)).sine;
    return sum * (swell * swell);
}

} // namespace tonewalk
