// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/maths/averaged_spectrum.hpp"

#include <algorithm>

namespace tonewalk {

averaged_spectrum::averaged_spectrum(const window& w)
    : fft_{w.size()}, weights_(w.size()), waiting_(w.size()), powers_(w.size(), 0.0) {
    const double sum = w.coherent_gain() * static_cast<double>(w.size());
    for (std::size_t n = 0; n < w.size(); ++n) {
        weights_[n] = static_cast<float>(w.values()[n] / sum);
    }
}

void averaged_spectrum::add(std::span<const cf32> samples) noexcept {
    const std::size_t hop = std::max<std::size_t>(1, size() / 2);
    while (!samples.empty()) {
        const std::size_t take = std::min(samples.size(), size() - filled_);
        std::copy_n(samples.begin(), take, waiting_.begin() + static_cast<std::ptrdiff_t>(filled_));
        samples = samples.subspan(take);
        filled_ += take;
        if (filled_ == size()) {
            transform();
            std::copy(waiting_.begin() + static_cast<std::ptrdiff_t>(hop), waiting_.end(),
                      waiting_.begin());
            filled_ = size() - hop;
        }
    }
}

void averaged_spectrum::transform() noexcept {
    const std::span<cf32> in = fft_.input();
    for (std::size_t n = 0; n < size(); ++n) {
        in[n] = waiting_[n] * weights_[n];
    }
    fft_.run();
    const std::span<const cf32> out = fft_.output();
    for (std::size_t k = 0; k < size(); ++k) {
        powers_[k] += static_cast<double>(std::norm(out[k]));
    }
    ++segments_;
}

std::vector<double> averaged_spectrum::powers() const {
    std::vector<double> ordered(size());
    const auto negative = static_cast<std::ptrdiff_t>((size() + 1) / 2);
    std::rotate_copy(powers_.begin(), powers_.begin() + negative, powers_.end(), ordered.begin());
    const double share = 1.0 / static_cast<double>(std::max<std::size_t>(1, segments_));
    for (double& power : ordered) {
        power *= share;
    }
    return ordered;
}

} // namespace tonewalk
