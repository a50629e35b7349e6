// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/detect/audio_resampler.hpp"

#include <algorithm>
#include <cmath>
#include <numbers>

#include "dot.hpp"
#include "tonewalk/base/random.hpp"
#include "tonewalk/maths/fir.hpp"

namespace tonewalk {
namespace {

__extension__ using wide = unsigned __int128;

/// So many rows per input sample that a straight line between two of them is true to -130 dB.
std::size_t rows_per_sample(double stop_edge_hz, double rate_hz) noexcept {
    constexpr double line_error = 3e-7; // of a sine: (step in radians)^2 / 8
    const double step = std::sqrt(8.0 * line_error);
    return static_cast<std::size_t>(
        std::ceil(2.0 * std::numbers::pi * stop_edge_hz / rate_hz / step));
}

} // namespace

audio_resampler::audio_resampler(const config& c)
    : phases_{rows_per_sample(c.stop_edge_hz, c.input_rate_hz)} {
    const double part_hz = std::fmod(c.input_rate_hz, c.output_rate_hz); // exact
    step_whole_ = std::llround((c.input_rate_hz - part_hz) / c.output_rate_hz);
    step_fraction_ = phase_step(part_hz, c.output_rate_hz);

    const auto dense = static_cast<double>(phases_);
    const std::vector<double> taps = design_low_pass({.rate_hz = c.input_rate_hz * dense,
                                                      .pass_edge_hz = c.pass_edge_hz,
                                                      .stop_edge_hz = c.stop_edge_hz,
                                                      .attenuation_db = c.attenuation_db,
                                                      .half_multiple_of = phases_});
    reach_ = taps.size() / 2 / phases_;
    for (std::size_t phase = 0; phase <= phases_; ++phase) {
        for (std::size_t i = 0; i <= 2 * reach_; ++i) { // input i - reach_ from the output's own
            const std::size_t tap = (2 * reach_ - i) * phases_ + phase;
            rows_.push_back(tap < taps.size() ? dense * taps[tap] : 0.0);
        }
    }
}

void audio_resampler::begin(double first_position) noexcept {
    const double whole = std::floor(first_position);
    start_ = {static_cast<sample_index>(whole),
              static_cast<std::uint64_t>(std::ldexp(first_position - whole, 64))};
    history_.assign(reach_, 0.0F);
    first_ = -static_cast<sample_index>(reach_);
    inputs_ = outputs_ = 0;
}

fine_position audio_resampler::position(sample_index output) const noexcept {
    const auto k = static_cast<std::uint64_t>(output);
    const wide part = static_cast<wide>(k) * step_fraction_ + start_.fraction;
    return {start_.whole + output * step_whole_ + static_cast<sample_index>(part >> 64),
            static_cast<std::uint64_t>(part)};
}

void audio_resampler::add(std::span<const float> in, std::vector<float>& out) {
    history_.insert(history_.end(), in.begin(), in.end());
    inputs_ += static_cast<sample_index>(in.size());
    produce(inputs_ - static_cast<sample_index>(reach_), out);
}

void audio_resampler::end(std::vector<float>& out) {
    history_.insert(history_.end(), reach_, 0.0F);
    produce(inputs_, out);
}

/// All outputs that stand before input `end`.
void audio_resampler::produce(sample_index end, std::vector<float>& out) {
    fine_position next = position(outputs_);
    while (next.whole < end) {
        out.push_back(output_at(next));
        next = position(++outputs_);
    }
    const sample_index surplus = std::min(next.whole - static_cast<sample_index>(reach_) - first_,
                                          static_cast<sample_index>(history_.size()));
    if (surplus > static_cast<sample_index>(history_.size() / 2)) {
        history_.erase(history_.begin(), history_.begin() + surplus);
        first_ += surplus;
    }
}

float audio_resampler::output_at(const fine_position& p) const noexcept {
    const double place =
        std::ldexp(static_cast<double>(p.fraction), -64) * static_cast<double>(phases_);
    const auto row = std::min(static_cast<std::size_t>(place), phases_ - 1);
    const double share = place - static_cast<double>(row);
    const std::size_t row_taps = 2 * reach_ + 1;
    const std::span<const double> rows{rows_};
    const float* in = history_.data() + (p.whole - static_cast<sample_index>(reach_) - first_);
    const double lower = dot(rows.subspan(row * row_taps, row_taps), in);
    const double upper = dot(rows.subspan((row + 1) * row_taps, row_taps), in);
    return static_cast<float>(lower + share * (upper - lower));
}

} // namespace tonewalk
