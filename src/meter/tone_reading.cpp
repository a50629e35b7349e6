// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/meter/tone_reading.hpp"

#include <algorithm>
#include <cassert>
#include <cmath>
#include <numbers>

#include "tonewalk/base/decibel.hpp"
#include "tonewalk/base/estimate.hpp"

namespace tonewalk {

tone_reading::tone_reading(const config& c)
    : config_{c}, detector_{make_detector(c.detector, c.grid.rate_hz, c.width_hz)},
      window_{hann_window(static_cast<std::size_t>(c.grid.window_samples()))} {
    assert(c.tone_hz > 0.0 && c.tone_hz < 0.5 * c.grid.rate_hz);
    // Least squares of constant, cosine and sine. The window is even about its centre, so that the
    // sine stands alone and the cosine has only the constant to give up.
    const auto w = window_.values();
    const double step = 2.0 * std::numbers::pi * c.tone_hz / c.grid.rate_hz;
    const double centre = 0.5 * static_cast<double>(w.size());
    double weight = 0.0, mean = 0.0;
    for (std::size_t i = 0; i < w.size(); ++i) {
        const double angle = step * (static_cast<double>(i) - centre);
        cosine_.push_back(std::cos(angle));
        sine_.push_back(std::sin(angle));
        weight += w[i];
        mean += w[i] * cosine_[i];
    }
    mean /= weight;
    double cosine_power = 0.0, sine_power = 0.0;
    for (std::size_t i = 0; i < w.size(); ++i) {
        cosine_[i] -= mean;
        cosine_power += w[i] * cosine_[i] * cosine_[i];
        sine_power += w[i] * sine_[i] * sine_[i];
    }
    for (std::size_t i = 0; i < w.size(); ++i) {
        cosine_[i] *= w[i] / cosine_power;
        sine_[i] *= w[i] / sine_power;
    }
}

void tone_reading::begin_stretch(const baseband_stretch& stretch) {
    held_ = stretch.held;
    detector_->begin();
    gaps_.clear();
    audio_.clear();
    first_ = inputs_ = record_ = 0;
}

void tone_reading::add(const baseband_block& block) {
    inputs_ += std::ssize(block.iq);
    gaps_.add(block.non_finite, static_cast<sample_index>(detector_->spread_samples()));
    if (held_) {
        detector_->add(block.iq, audio_);
    }
    read_records(held_ ? first_ + std::ssize(audio_) : inputs_);
}

void tone_reading::end_stretch() {
    if (held_) {
        detector_->end(audio_);
    }
    read_records(inputs_);
}

/// Reads every record that a stretch of `complete` samples holds for certain.
void tone_reading::read_records(sample_index complete) {
    const sample_index length = config_.grid.window_samples();
    while (config_.grid.holds(record_, complete)) {
        const sample_index first = config_.grid.first(record_);
        const bool whole = held_ && !gaps_.touches(first, length);
        amplitudes_.push_back(whole ? read(first) : not_measured);
        ++record_;
    }
    const sample_index next = config_.grid.first(record_);
    gaps_.forget_before(next);
    const auto surplus = std::min<sample_index>(next - first_, std::ssize(audio_));
    if (surplus > std::ssize(audio_) / 2) {
        audio_.erase(audio_.begin(), audio_.begin() + surplus);
        first_ += surplus;
    }
}

double tone_reading::read(sample_index first) const {
    const float* audio = audio_.data() + (first - first_);
    double in_phase = 0.0, quadrature = 0.0;
    for (std::size_t i = 0; i < cosine_.size(); ++i) {
        const auto sample = static_cast<double>(audio[i]);
        in_phase += cosine_[i] * sample;
        quadrature += sine_[i] * sample;
    }
    return std::hypot(in_phase, quadrature);
}

std::vector<double> tone_reading::tone_dbfs(double tone_hz) const {
    const double window_s = static_cast<double>(window_.size()) / config_.grid.rate_hz;
    const double droop = window_.response((tone_hz - config_.tone_hz) * window_s);
    std::vector<double> levels(amplitudes_.size());
    std::transform(amplitudes_.begin(), amplitudes_.end(), levels.begin(), [&](double amplitude) {
        return decibel::from_amplitude_ratio(amplitude / (droop * config_.response)).db();
    });
    return levels;
}

std::string_view tone_reading::column_key() const noexcept {
    return config_.detector == detector_kind::envelope ? "envelope_tone_dbfs"
                                                       : "synchronous_tone_dbfs";
}

} // namespace tonewalk
