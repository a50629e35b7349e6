// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/detect/narrow_low_pass.hpp"

#include <algorithm>

#include "tonewalk/maths/fir.hpp"

namespace tonewalk {
namespace {

std::size_t slow_factor(double rate_hz, double stop_edge_hz) noexcept {
    return static_cast<std::size_t>(std::max(1.0, rate_hz / (8.0 * stop_edge_hz)));
}

/// Images of a strong carrier would stand in the audio as lines: they are kept below all else.
std::vector<double> image_filter(double rate_hz, double band_hz, std::size_t factor) {
    constexpr double image_attenuation_db = 130.0;
    const double slow_rate_hz = rate_hz / static_cast<double>(factor);
    return design_low_pass({.rate_hz = rate_hz,
                            .pass_edge_hz = band_hz,
                            .stop_edge_hz = slow_rate_hz - band_hz,
                            .attenuation_db = image_attenuation_db,
                            .half_multiple_of = factor});
}

} // namespace

template <class Sample>
narrow_low_pass<Sample>::narrow_low_pass(const config& c)
    : factor_{slow_factor(c.rate_hz, c.stop_edge_hz)},
      decimator_{{.taps = design_low_pass({.rate_hz = c.rate_hz,
                                           .pass_edge_hz = c.pass_edge_hz,
                                           .stop_edge_hz = c.stop_edge_hz,
                                           .attenuation_db = c.attenuation_db}),
                  .up = 1,
                  .down = factor_}} {
    if (factor_ > 1) {
        interpolator_.emplace(typename fir_stage<Sample>::config{
            .taps = image_filter(c.rate_hz, c.stop_edge_hz, factor_), .up = factor_, .down = 1});
    }
}

template <class Sample>
void narrow_low_pass<Sample>::begin() noexcept {
    decimator_.begin();
    if (interpolator_) {
        interpolator_->begin();
    }
    inputs_ = outputs_ = 0;
}

template <class Sample>
void narrow_low_pass<Sample>::add(std::span<const Sample> in, std::vector<Sample>& out) {
    inputs_ += static_cast<sample_index>(in.size());
    if (!interpolator_) {
        decimator_.add(in, out);
        return;
    }
    slow_.clear();
    decimator_.add(in, slow_);
    expand(out);
}

template <class Sample>
void narrow_low_pass<Sample>::end(std::vector<Sample>& out) {
    if (!interpolator_) {
        decimator_.end(out);
        return;
    }
    slow_.clear();
    decimator_.end(slow_);
    const std::size_t before = out.size();
    interpolator_->add(slow_, out);
    interpolator_->end(out);
    // The last decimated sample stands for up to factor_ inputs; some of them may not be there.
    outputs_ += static_cast<sample_index>(out.size() - before);
    out.resize(out.size() - static_cast<std::size_t>(outputs_ - inputs_));
}

template <class Sample>
void narrow_low_pass<Sample>::expand(std::vector<Sample>& out) {
    const std::size_t before = out.size();
    interpolator_->add(slow_, out);
    outputs_ += static_cast<sample_index>(out.size() - before);
}

template <class Sample>
std::size_t narrow_low_pass<Sample>::reach_samples() const noexcept {
    const std::size_t slow_reach = interpolator_ ? interpolator_->reach_samples() : 0;
    return decimator_.reach_samples() + slow_reach * factor_;
}

template class narrow_low_pass<float>;
template class narrow_low_pass<cf32>;

} // namespace tonewalk
