// SPDX-License-Identifier: GPL-3.0-or-later
#include "waveform_truth.hpp"

#include <algorithm>
#include <cmath>

#include "exact.hpp"
#include "tonewalk/base/estimate.hpp"

namespace tonewalk {
namespace {

constexpr unsigned cycle_points = 4096;

bool sounds(const scene_tone& tone, double time_s) noexcept {
    return tone.start_s <= time_s && time_s < tone.stop_s;
}

/// A tone with its harmonics at `phase` of its cycle, relative to the carrier.
double tone_waveform(const scene_tone& tone, std::uint64_t phase) noexcept {
    double sum = exact_turn(phase).cosine;
    for (const scene_harmonic& each : tone.harmonics) {
        // The cycle begins where the tone's own phase is 0.
        sum += each.percent / 100.0 *
               exact_turn(each.order * phase + phase_from_deg(each.phase_deg)).cosine;
    }
    return tone.depth_percent / 100.0 * sum;
}

cf64 incidental_turn(const scene_tone& tone, std::uint64_t phase) noexcept {
    const double swing =
        exact_turn(phase + phase_from_deg(tone.incidental_phase_deg)).cosine * turns_per_rad;
    return unit_vector(phase_from_turns(tone.incidental_rad * swing));
}

/// Means over one cycle: of the incidental turn alone, and with the waveform.
struct cycle_means {
    cf64 turn, waveform;
};
cycle_means means_over_cycle(const scene_tone& tone) noexcept {
    cycle_means sum{};
    for (std::uint64_t k = 0; k < cycle_points; ++k) {
        const std::uint64_t phase = k * (std::uint64_t{1} << 52U);
        const cf64 turn = incidental_turn(tone, phase);
        sum.turn += turn;
        sum.waveform += tone_waveform(tone, phase) * turn;
    }
    return {sum.turn / double{cycle_points}, sum.waveform / double{cycle_points}};
}

/// Mean of (1 + sum of w_i) times the product of the turns, the tones' cycles independent.
double folded_line(const std::vector<const scene_tone*>& sounding) {
    std::vector<cycle_means> means;
    means.reserve(sounding.size());
    for (const scene_tone* tone : sounding)
        means.push_back(means_over_cycle(*tone));
    cf64 line{1.0, 0.0};
    for (const cycle_means& each : means)
        line = product(line, each.turn);
    for (std::size_t k = 0; k < means.size(); ++k) {
        cf64 share = means[k].waveform;
        for (std::size_t other = 0; other < means.size(); ++other)
            if (other != k)
                share = product(share, means[other].turn);
        line += share;
    }
    return magnitude(line);
}

waveform_truth pinched_tone(const scene_tone& tone) noexcept {
    cf64 line{}, fundamental{};
    for (std::uint64_t k = 0; k < cycle_points; ++k) {
        const std::uint64_t phase = k * (std::uint64_t{1} << 52U);
        const double envelope = std::max(0.0, 1.0 + tone_waveform(tone, phase));
        line += envelope * incidental_turn(tone, phase);
        fundamental += envelope * unit_vector(0U - phase);
    }
    return {magnitude(line) / cycle_points, {2.0 * magnitude(fundamental) / cycle_points}};
}

double deepest(const scene_carrier& carrier) {
    double sum = carrier.speech_percent;
    for (const scene_tone& tone : carrier.tones) {
        double lowest = 0.0; // the waveform's own minimum, not the sum of its lines
        for (std::uint64_t k = 0; k < cycle_points; ++k)
            lowest = std::min(lowest, tone_waveform(tone, k * (std::uint64_t{1} << 52U)));
        sum -= 100.0 * lowest;
    }
    for (const scene_hum& each : carrier.hum)
        sum += each.depth_percent;
    return sum;
}

} // namespace

bool overmodulated(const scene_carrier& carrier) {
    return deepest(carrier) > 100.0 + 1e-9;
}

waveform_truth waveform_at(const scene_carrier& carrier, double time_s) {
    std::vector<const scene_tone*> sounding;
    waveform_truth truth;
    for (const scene_tone& tone : carrier.tones) {
        truth.tones.push_back(sounds(tone, time_s) ? tone.depth_percent / 100.0 : 0.0);
        if (sounds(tone, time_s))
            sounding.push_back(&tone);
    }
    const bool pinched =
        carrier.overmodulation == overmodulation::pinch_off && overmodulated(carrier);
    if (!pinched || sounding.empty()) {
        truth.line = folded_line(sounding);
        return truth;
    }
    const bool alone = sounding.size() == 1 && carrier.hum.empty() && carrier.speech_percent == 0.0;
    const waveform_truth one =
        alone ? pinched_tone(*sounding.front()) : waveform_truth{not_measured, {not_measured}};
    truth.line = one.line;
    for (double& amplitude : truth.tones)
        if (amplitude > 0.0)
            amplitude = one.tones.front();
    return truth;
}

} // namespace tonewalk
