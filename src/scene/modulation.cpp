// SPDX-License-Identifier: GPL-3.0-or-later
#include "modulation.hpp"

#include <algorithm>

#include "exact.hpp"

namespace tonewalk {
namespace {

constexpr std::uint64_t speech_stream = 0x5350;

modulation_line line_at(double frequency_hz, double phase_deg, double depth, double rate_hz,
                        double delay_s) {
    return {frequency_hz, depth, phase_step(frequency_hz, rate_hz),
            phase_from_deg(phase_deg) - phase_from_turns(frequency_hz * delay_s), position_span{}};
}

void add_line(const modulation_line& line, sample_index first, std::span<double> out) noexcept {
    const block_part on = part_of_block(line.on, first, out.size());
    std::uint64_t phase = line.phase_at(first + static_cast<sample_index>(on.begin));
    for (double& value : out.subspan(on.begin, on.end - on.begin)) {
        value += line.depth * exact_turn(phase).cosine;
        phase += line.step;
    }
}

} // namespace

std::vector<modulation_line> modulation_lines(const scene_carrier& carrier, double rate_hz,
                                              double delay_s) {
    std::vector<modulation_line> lines;
    for (const scene_tone& tone : carrier.tones) {
        const double depth = tone.depth_percent / 100.0;
        const position_span on = span_between(tone.start_s, tone.stop_s, delay_s, rate_hz);
        lines.push_back(line_at(tone.frequency_hz, tone.phase_deg, depth, rate_hz, delay_s));
        lines.back().on = on;
        for (const scene_harmonic& each : tone.harmonics) {
            const double order = each.order;
            lines.push_back(line_at(order * tone.frequency_hz,
                                    order * tone.phase_deg + each.phase_deg,
                                    depth * each.percent / 100.0, rate_hz, delay_s));
            lines.back().on = on;
        }
    }
    for (const scene_hum& each : carrier.hum)
        lines.push_back(line_at(each.frequency_hz, each.phase_deg, each.depth_percent / 100.0,
                                rate_hz, delay_s));
    return lines;
}

modulation::modulation(const scene& whole, std::size_t carrier, double delay_s)
    : lines_{modulation_lines(whole.carriers[carrier], whole.rate_hz, delay_s)},
      speech_depth_{whole.carriers[carrier].speech_percent / 100.0}, rate_hz_{whole.rate_hz},
      delay_s_{delay_s}, pinched_{whole.carriers[carrier].overmodulation ==
                                  overmodulation::pinch_off} {
    for (const scene_tone& tone : whole.carriers[carrier].tones) {
        if (tone.incidental_rad == 0.0)
            continue;
        incidental_.push_back(line_at(tone.frequency_hz, tone.phase_deg + tone.incidental_phase_deg,
                                      tone.incidental_rad * turns_per_rad, rate_hz_, delay_s));
        incidental_.back().on = span_between(tone.start_s, tone.stop_s, delay_s, rate_hz_);
    }
    if (speech_depth_ > 0.0)
        speech_.emplace(whole.seed, speech_stream + carrier);
}

void modulation::envelope(sample_index first, std::span<double> out) noexcept {
    std::fill(out.begin(), out.end(), 1.0);
    for (const modulation_line& line : lines_)
        add_line(line, first, out);
    if (speech_)
        for (std::size_t k = 0; k < out.size(); ++k)
            out[k] +=
                speech_depth_ *
                speech_->at(static_cast<double>(first + static_cast<sample_index>(k)) / rate_hz_ -
                            delay_s_);
    if (pinched_)
        for (double& value : out)
            value = std::max(0.0, value);
}

void modulation::add_incidental(sample_index first, std::span<double> turns) const noexcept {
    for (const modulation_line& line : incidental_)
        add_line(line, first, turns);
}

} // namespace tonewalk
