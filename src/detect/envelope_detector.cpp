// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/detect/envelope_detector.hpp"

#include <algorithm>
#include <cmath>

#include <fmt/format.h>

#include "tonewalk/base/error.hpp"
#include "tonewalk/maths/fir.hpp"

namespace tonewalk {
namespace {

constexpr double least_rate_over_width = 4.0;
constexpr double widest_pass_over_rate = 0.45; // leaves a tenth of the rate to fall off

std::size_t dense_factor(const envelope_detector::config& c) {
    if (!(c.width_hz > 0.0) || c.width_hz > c.rate_hz) {
        throw error{fault::bad_request, "the channel is wider than its sample rate holds",
                    fmt::format("--width {} Hz at {} samples/s", c.width_hz, c.rate_hz),
                    "give a smaller --width"};
    }
    return static_cast<std::size_t>(std::ceil(least_rate_over_width * c.width_hz / c.rate_hz));
}

/// Keeps what the given rate holds, at `factor` times that rate.
std::vector<double> band_filter(double rate_hz, double wanted_hz, std::size_t factor) {
    const double pass_hz = std::min(wanted_hz, widest_pass_over_rate * rate_hz);
    return design_low_pass({.rate_hz = rate_hz * static_cast<double>(factor),
                            .pass_edge_hz = pass_hz,
                            .stop_edge_hz = rate_hz - pass_hz,
                            .half_multiple_of = factor});
}

} // namespace

envelope_detector::envelope_detector(const config& c) : factor_{dense_factor(c)} {
    if (factor_ > 1) {
        // The samples reach to 0.75 width off the carrier, the audio that is wanted to half the
        // width.
        interpolator_.emplace(fir_stage<cf32>::config{
            .taps = band_filter(c.rate_hz, 0.75 * c.width_hz, factor_), .up = factor_, .down = 1});
        decimator_.emplace(fir_stage<float>::config{
            .taps = band_filter(c.rate_hz, 0.5 * c.width_hz, factor_), .up = 1, .down = factor_});
    }
}

void envelope_detector::begin() {
    if (factor_ > 1) {
        interpolator_->begin();
        decimator_->begin();
    }
}

void envelope_detector::magnitudes() {
    magnitude_.resize(dense_.size());
    std::transform(dense_.begin(), dense_.end(), magnitude_.begin(), [](cf32 z) {
        const double i = static_cast<double>(z.real()), q = static_cast<double>(z.imag());
        return static_cast<float>(std::sqrt(i * i + q * q));
    });
}

void envelope_detector::add(std::span<const cf32> in, std::vector<float>& out) {
    if (factor_ == 1) {
        dense_.assign(in.begin(), in.end());
        magnitudes();
        out.insert(out.end(), magnitude_.begin(), magnitude_.end());
        return;
    }
    dense_.clear();
    interpolator_->add(in, dense_);
    magnitudes();
    decimator_->add(magnitude_, out);
}

void envelope_detector::end(std::vector<float>& out) {
    if (factor_ == 1) {
        return;
    }
    dense_.clear();
    interpolator_->end(dense_);
    magnitudes();
    decimator_->add(magnitude_, out);
    decimator_->end(out);
}

std::size_t envelope_detector::lag_samples() const noexcept {
    if (factor_ == 1) {
        return 0;
    }
    return interpolator_->reach_samples() + (decimator_->reach_samples() + factor_ - 1) / factor_;
}

} // namespace tonewalk
