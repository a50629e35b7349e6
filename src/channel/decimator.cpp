// SPDX-License-Identifier: GPL-3.0-or-later
#include "decimator.hpp"

#include <algorithm>
#include <cassert>
#include <utility>

#include "filter_shape.hpp"
#include "tonewalk/maths/fir.hpp"

namespace tonewalk {
namespace {

sample_index ceiling_quotient(sample_index a, sample_index b) {
    return a >= 0 ? (a + b - 1) / b : -(-a / b);
}

} // namespace

decimator::decimator(std::vector<double> taps, double rate_hz, std::size_t decimation)
    : taps_{std::move(taps)}, rate_hz_{rate_hz}, half_{taps_.size() / 2},
      decimation_{decimation}, padded_{(taps_.size() + lanes - 1) / lanes * lanes},
      lane_taps_(padded_, 0.0F) {
    for (std::size_t k = 0; k < taps_.size(); ++k) {
        lane_taps_[k] = static_cast<float>(taps_[k]);
    }
    assert(taps_.size() % 2 == 1 && decimation_ <= taps_.size());
}

sample_index decimator::begin(sample_index first_input) {
    const auto half = static_cast<sample_index>(half_);
    next_output_ = ceiling_quotient(first_input - half, static_cast<sample_index>(decimation_));
    start_ = next_output_ * static_cast<sample_index>(decimation_) - half;
    const auto zeros = static_cast<std::size_t>(first_input - start_);
    real_.assign(zeros, 0.0F);
    imaginary_.assign(zeros, 0.0F);
    return next_output_;
}

void decimator::add(std::span<const cf32> in, std::vector<cf32>& out) {
    const std::size_t held = real_.size();
    real_.resize(held + in.size());
    imaginary_.resize(held + in.size());
    for (std::size_t n = 0; n < in.size(); ++n) {
        real_[held + n] = in[n].real();
        imaginary_[held + n] = in[n].imag();
    }
    produce(out);
}

void decimator::end(std::vector<cf32>& out) {
    real_.resize(real_.size() + half_, 0.0F);
    imaginary_.resize(imaginary_.size() + half_, 0.0F);
    produce(out);
}

void decimator::produce(std::vector<cf32>& out) {
    const std::size_t inputs = real_.size();
    std::size_t place = 0;
    real_.resize(inputs + lanes, 0.0F); // the padding's partners: finite, times zero
    imaginary_.resize(inputs + lanes, 0.0F);
    for (; place + taps_.size() <= inputs; place += decimation_) {
        float re[lanes] = {}, im[lanes] = {};
        for (std::size_t k = 0; k < padded_; k += lanes) {
            for (std::size_t l = 0; l < lanes; ++l) {
                re[l] += real_[place + k + l] * lane_taps_[k + l];
                im[l] += imaginary_[place + k + l] * lane_taps_[k + l];
            }
        }
        double sum_re = 0.0, sum_im = 0.0;
        for (std::size_t l = 0; l < lanes; ++l) {
            sum_re += static_cast<double>(re[l]);
            sum_im += static_cast<double>(im[l]);
        }
        out.emplace_back(static_cast<float>(sum_re), static_cast<float>(sum_im));
        ++next_output_;
    }
    place = std::min(place, inputs);
    real_.resize(inputs);
    imaginary_.resize(inputs);
    real_.erase(real_.begin(), real_.begin() + static_cast<std::ptrdiff_t>(place));
    imaginary_.erase(imaginary_.begin(), imaginary_.begin() + static_cast<std::ptrdiff_t>(place));
    start_ += static_cast<sample_index>(place);
}

double decimator::response(double hz) const noexcept {
    return symmetric_response(taps_, rate_hz_, hz);
}

} // namespace tonewalk
