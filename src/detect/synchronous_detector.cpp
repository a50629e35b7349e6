// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/detect/synchronous_detector.hpp"

#include <algorithm>
#include <cmath>
#include <numbers>

#include <fmt/format.h>

#include "tonewalk/base/error.hpp"

namespace tonewalk {
namespace {

constexpr double full_turn = 2.0 * std::numbers::pi;

const synchronous_detector::config& checked(const synchronous_detector::config& c) {
    if (!(c.rate_hz >= 2.0 * c.stop_edge_hz)) {
        throw error{fault::bad_request, "too few samples for a synchronous detector",
                    fmt::format("--detector synchronous at {} samples/s", c.rate_hz),
                    "give a greater --width or take --detector envelope"};
    }
    return c;
}

cf64 product(cf64 a, cf64 b) noexcept {
    return {a.real() * b.real() - a.imag() * b.imag(), a.real() * b.imag() + a.imag() * b.real()};
}

std::size_t at_least_one(double samples) noexcept {
    return static_cast<std::size_t>(std::max(1.0, std::round(samples)));
}

} // namespace

synchronous_detector::synchronous_detector(const config& c)
    : config_{checked(c)}, narrow_{{.rate_hz = c.rate_hz,
                                    .pass_edge_hz = c.pass_edge_hz,
                                    .stop_edge_hz = c.stop_edge_hz}},
      hop_samples_{at_least_one(c.hop_s * c.rate_hz)}, span_averages_{at_least_one(
                                                           c.phase_span_s * c.rate_hz /
                                                           static_cast<double>(narrow_.factor()))},
      decay_{std::exp(-static_cast<double>(narrow_.factor()) / (c.rate_hz * c.memory_s))} {}

void synchronous_detector::begin() {
    narrow_.begin();
    pending_.clear();
    averages_.assign(span_averages_, {});
    averages_seen_ = 0;
    outputs_ = 0;
    in_hop_ = 0;
    hop_turns_ = 0.0;
    hop_hz_ = next_hop_hz_;
    lagged_power_ = {};
    power_ = 0.0;
}

void synchronous_detector::add(std::span<const cf32> in, std::vector<float>& out) {
    while (!in.empty()) {
        const auto part = in.first(std::min(in.size(), hop_samples_ - in_hop_));
        rotate(part);
        narrow_.add(rotated_, carrier_);
        detect(out);
        in = in.subspan(part.size());
        in_hop_ += part.size();
        if (in_hop_ == hop_samples_) {
            next_hop();
        }
    }
}

void synchronous_detector::end(std::vector<float>& out) {
    narrow_.end(carrier_);
    detect(out);
}

/// Phase of the frame, in turns, `sample` samples after the hop's start: its frequency is a
/// straight line.
double synchronous_detector::turns_at(double sample) const noexcept {
    const double slope_hz = (next_hop_hz_ - hop_hz_) / static_cast<double>(hop_samples_);
    return hop_turns_ + (hop_hz_ + 0.5 * slope_hz * sample) * sample / config_.rate_hz;
}

double synchronous_detector::frame_hz() const noexcept {
    const double share = static_cast<double>(in_hop_) / static_cast<double>(hop_samples_);
    return hop_hz_ + share * (next_hop_hz_ - hop_hz_);
}

void synchronous_detector::rotate(std::span<const cf32> in) {
    rotated_.clear();
    for (std::size_t i = 0; i < in.size(); ++i) {
        const double angle = full_turn * turns_at(static_cast<double>(in_hop_ + i));
        const cf64 turn{std::cos(angle), std::sin(angle)};
        const cf64 turned = product(cf64{in[i]}, std::conj(turn));
        rotated_.emplace_back(static_cast<float>(turned.real()), static_cast<float>(turned.imag()));
        pending_.push_back({rotated_.back(), turn});
    }
}

void synchronous_detector::detect(std::vector<float>& out) {
    for (std::size_t i = 0; i < carrier_.size(); ++i) {
        const cf64 carrier{carrier_[i]}, sample{pending_[i].in_frame};
        const double size = std::abs(carrier);
        const double in_phase = product(sample, std::conj(carrier)).real();
        out.push_back(size > 0.0 ? static_cast<float>(in_phase / size) : 0.0F);
        if (outputs_ % static_cast<sample_index>(narrow_.factor()) == 0) {
            observe(product(carrier, pending_[i].turn));
        }
        ++outputs_;
    }
    pending_.erase(pending_.begin(),
                   pending_.begin() + static_cast<std::ptrdiff_t>(carrier_.size()));
    carrier_.clear();
}

void synchronous_detector::observe(cf64 carrier) {
    cf64& before = averages_[averages_seen_ % span_averages_];
    lagged_power_ = decay_ * lagged_power_ + product(carrier, std::conj(before));
    power_ = decay_ * power_ + std::abs(carrier) * std::abs(before);
    before = carrier;
    ++averages_seen_;
}

/// The next hop's frame runs from where this one ends to where the carrier was last seen.
void synchronous_detector::next_hop() {
    hop_turns_ = std::remainder(turns_at(static_cast<double>(hop_samples_)), 1.0);
    hop_hz_ = next_hop_hz_;
    in_hop_ = 0;
    if (!(std::abs(lagged_power_) > config_.least_coherence * power_)) {
        return;
    }
    const double span_s = static_cast<double>(span_averages_ * narrow_.factor()) / config_.rate_hz;
    const double turns = std::arg(lagged_power_) / full_turn - hop_hz_ * span_s;
    next_hop_hz_ = hop_hz_ + std::remainder(turns, 1.0) / span_s;
}

} // namespace tonewalk
