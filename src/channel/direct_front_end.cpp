// SPDX-License-Identifier: GPL-3.0-or-later
#include "direct_front_end.hpp"

#include <algorithm>
#include <cassert>
#include <cmath>

#include <fmt/core.h>

#include "filter_shape.hpp"
#include "tonewalk/base/error.hpp"
#include "tonewalk/base/quantity.hpp"
#include "tonewalk/base/random.hpp"
#include "tonewalk/maths/fir.hpp"

namespace tonewalk {
namespace {

constexpr std::size_t least_cell_samples = 1024;
constexpr double least_rate_in_widths = 8.0; // of the output
constexpr std::size_t most_decimation = 64;  // later steps are the chain's

std::size_t rounded_up(std::size_t n, std::size_t multiple) {
    return (n + multiple - 1) / multiple * multiple;
}

std::size_t choose_decimation(double rate_hz, double width_hz) {
    const double steps = std::floor(rate_hz / (least_rate_in_widths * width_hz));
    return static_cast<std::size_t>(std::clamp(steps, 1.0, static_cast<double>(most_decimation)));
}

double widest_hz(std::span<const channel_plan> plans) {
    double widest = 0.0;
    for (const channel_plan& plan : plans) {
        widest = std::max(widest, plan.width_hz);
    }
    return widest;
}

[[noreturn]] void refuse(const channel_plan& plan, const stream_facts& facts) {
    throw error{fault::malformed,
                fmt::format("its band of {} does not hold a channel of {} at {}",
                            format_hz(facts.sample_rate_hz), format_hz(plan.width_hz),
                            format_option_hz(plan.carrier_hz, !plan.absolute)),
                facts.where(), "give another --carrier or a smaller --width"};
}

} // namespace

struct direct_front_end::scratch final : workspace {
    scratch(std::size_t block_samples, std::size_t lead_samples, std::size_t padding,
            std::size_t tail)
        : converted(lead_samples + block_samples), history(lead_samples + padding),
          real(history + block_samples + tail), imaginary(history + block_samples + tail) {}
    std::vector<cf32> converted; // lead and block
    std::size_t history;         // real[history] is the block's first sample
    std::vector<float> real, imaginary;
};

direct_front_end::direct_front_end(const stream_facts& facts, std::span<const channel_plan> plans,
                                   cf64 image_ratio)
    : converter_{facts, image_ratio}, frame_bytes_{facts.frame_bytes()}, input_rate_hz_{
                                                                             facts.sample_rate_hz} {
    const double width_hz = widest_hz(plans);
    decimation_ = plans.empty() ? 1 : choose_decimation(input_rate_hz_, width_hz);
    output_rate_hz_ = input_rate_hz_ / static_cast<double>(decimation_);
    cell_ = rounded_up(least_cell_samples, decimation_);
    low_pass_ = decimation_ == 1
                    ? std::vector<double>{1.0}
                    : design_low_pass({.rate_hz = input_rate_hz_,
                                       .pass_edge_hz = width_hz / 2.0,
                                       .stop_edge_hz = output_rate_hz_ - stop_in_widths * width_hz,
                                       .attenuation_db = 105.0,
                                       .half_multiple_of = decimation_});
    delay_outputs_ = low_pass_.size() / 2 / decimation_;
    padded_taps_ = rounded_up(low_pass_.size(), lanes);
    for (const channel_plan& plan : plans) {
        std::vector<int>& of_stretch = tuning_of_.emplace_back();
        for (const stretch_facts& stretch : facts.stretches) {
            const auto offset_hz = offset_in(plan, facts, stretch);
            of_stretch.push_back(offset_hz ? static_cast<int>(tune(*offset_hz)) : -1);
        }
        if (std::all_of(of_stretch.begin(), of_stretch.end(), [](int t) { return t < 0; })) {
            refuse(plan, facts);
        }
    }
}

std::size_t direct_front_end::tune(double offset_hz) {
    for (std::size_t k = 0; k < tunings_.size(); ++k) {
        if (tunings_[k].offset_hz == offset_hz) {
            return k;
        }
    }
    tuning made{offset_hz, phase_step(offset_hz, input_rate_hz_), std::vector<float>(padded_taps_),
                std::vector<float>(padded_taps_)};
    const std::size_t taps = low_pass_.size();
    for (std::size_t j = 0; j < taps; ++j) { // j samples before the newest
        const exact_sine_cosine turn = exact_turn(made.step * j);
        const std::size_t place = padded_taps_ - 1 - j;
        made.real[place] = static_cast<float>(low_pass_[j] * turn.cosine);
        made.imaginary[place] = static_cast<float>(low_pass_[j] * turn.sine);
    }
    tunings_.push_back(std::move(made));
    return tunings_.size() - 1;
}

std::size_t direct_front_end::outputs(const raw_block& block) const noexcept {
    const std::size_t whole = (block.count + decimation_ - 1) / decimation_;
    return whole + (block.ends_stretch ? delay_outputs_ : 0);
}

bool direct_front_end::holds(std::size_t channel, std::uint32_t stretch) const noexcept {
    return tuning_of_[channel][stretch] >= 0;
}

double direct_front_end::response(std::size_t, double hz) const noexcept {
    return symmetric_response(low_pass_, input_rate_hz_, hz);
}

std::unique_ptr<workspace> direct_front_end::make_workspace(std::size_t block_samples) const {
    return std::make_unique<scratch>(block_samples, lead(), padded_taps_ - low_pass_.size(),
                                     (delay_outputs_ + 1) * decimation_);
}

void direct_front_end::process(const raw_block& block, workspace& space, raw_counts& counts,
                               std::span<const std::span<cf32>> out) const noexcept {
    auto& s = static_cast<scratch&>(space);
    load(block, s, counts);
    for (std::size_t channel = 0; channel < out.size(); ++channel) {
        const int which = tuning_of_[channel][block.stretch];
        if (which < 0) {
            std::fill(out[channel].begin(), out[channel].end(), cf32{});
        } else {
            filter(tunings_[static_cast<std::size_t>(which)], s, block.first, out[channel]);
        }
    }
}

/// The block as two planes, real and imaginary; history that is missing and what would follow the
/// block are zeros.
void direct_front_end::load(const raw_block& block, scratch& s, raw_counts& counts) const noexcept {
    const auto split = [&s](std::size_t place, std::span<const cf32> samples) {
        for (std::size_t k = 0; k < samples.size(); ++k) {
            s.real[place + k] = samples[k].real();
            s.imaginary[place + k] = samples[k].imag();
        }
    };
    const auto history = std::span{s.converted}.first(block.lead);
    const auto fresh = std::span{s.converted}.subspan(block.lead, block.count);
    const std::size_t missing = s.history - block.lead;
    const std::size_t end = s.history + block.count;
    for (std::vector<float>* plane : {&s.real, &s.imaginary}) {
        std::fill_n(plane->begin(), missing, 0.0F);
        std::fill(plane->begin() + static_cast<std::ptrdiff_t>(end), plane->end(), 0.0F);
    }
    counts.clear();
    converter_.convert(block.bytes, history);
    converter_.convert(block.bytes.subspan(block.lead * frame_bytes_), fresh, block.first, cell_,
                       counts);
    split(missing, history);
    split(s.history, fresh);
}

void direct_front_end::filter(const tuning& t, const scratch& s, sample_index first_stored,
                              std::span<cf32> out) const noexcept {
    for (std::size_t n = 0; n < out.size(); ++n) {
        const std::size_t newest = s.history + n * decimation_;
        const float* xr = s.real.data() + (newest + 1 - padded_taps_);
        const float* xi = s.imaginary.data() + (newest + 1 - padded_taps_);
        float re[lanes] = {}, im[lanes] = {};
        for (std::size_t k = 0; k < padded_taps_; k += lanes) {
            for (std::size_t l = 0; l < lanes; ++l) {
                const float hr = t.real[k + l], hi = t.imaginary[k + l];
                re[l] += xr[k + l] * hr - xi[k + l] * hi;
                im[l] += xr[k + l] * hi + xi[k + l] * hr;
            }
        }
        double sum_re = 0.0, sum_im = 0.0;
        for (std::size_t l = 0; l < lanes; ++l) {
            sum_re += static_cast<double>(re[l]);
            sum_im += static_cast<double>(im[l]);
        }
        const auto index = static_cast<std::uint64_t>(first_stored) + n * decimation_;
        const exact_sine_cosine turn = exact_turn(t.step * index);
        out[n] = {static_cast<float>(sum_re * turn.cosine + sum_im * turn.sine),
                  static_cast<float>(sum_im * turn.cosine - sum_re * turn.sine)};
    }
}

} // namespace tonewalk
