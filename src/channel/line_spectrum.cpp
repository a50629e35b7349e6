// SPDX-License-Identifier: GPL-3.0-or-later
#include "line_spectrum.hpp"

#include <algorithm>
#include <cassert>
#include <cmath>
#include <numbers>

#include "tonewalk/maths/fft.hpp"
#include "tonewalk/maths/quantile.hpp"

namespace tonewalk {
namespace {

constexpr std::size_t most_noise_run = 256;
constexpr std::size_t lobe_bins = 4;

} // namespace

line_spectrum::line_spectrum(std::size_t size, double rate_hz)
    : rate_hz_{rate_hz}, window_{blackman_harris_window(size)}, power_(size, 0.0) {
    noise_bins_ = window_.noise_bandwidth_bins();
}

void line_spectrum::add(std::span<const cf32> segment) {
    const std::size_t size = power_.size();
    assert(segment.size() == size);
    static thread_local std::unique_ptr<fft> transform;
    if (!transform || transform->size() != size) {
        transform = std::make_unique<fft>(size);
    }
    const std::span<cf32> in = transform->input();
    const double scale = 1.0 / (window_.coherent_gain() * static_cast<double>(size));
    for (std::size_t n = 0; n < size; ++n) {
        in[n] = segment[n] * static_cast<float>(window_.values()[n] * scale);
    }
    transform->run();
    const std::span<const cf32> out = transform->output();
    for (std::size_t k = 0; k < size; ++k) {
        const std::size_t place = (k + size / 2) % size;
        power_[place] += static_cast<double>(std::norm(out[k]));
    }
    ++segments_;
}

void line_spectrum::finish() {
    for (double& p : power_) {
        p /= static_cast<double>(std::max<std::size_t>(1, segments_));
    }
    noise_run_ = std::clamp<std::size_t>(power_.size() / 8, 8, most_noise_run);
    std::vector<double> medians;
    for (std::size_t first = 0; first < power_.size(); first += noise_run_) {
        const auto begin = power_.begin() + static_cast<std::ptrdiff_t>(first);
        const auto end = power_.begin() +
                         static_cast<std::ptrdiff_t>(std::min(first + noise_run_, power_.size()));
        medians.push_back(median({begin, end}));
    }
    // One segment's powers are exponential, whose median is ln 2 of the mean; many segments' come
    // to meet it.
    const double share =
        1.0 - (1.0 - std::numbers::ln2) / static_cast<double>(std::max<std::size_t>(1, segments_));
    noise_.resize(medians.size());
    for (std::size_t k = 0; k < medians.size();
         ++k) { // the middle of three: a crowd of lines lifts one run
        const double left = medians[k > 0 ? k - 1 : k],
                     right = medians[std::min(k + 1, medians.size() - 1)];
        const double middle =
            std::max(std::min(left, right), std::min(std::max(left, right), medians[k]));
        noise_[k] = std::max(middle / share, 1e-30);
    }
}

double line_spectrum::hz_of(double bin) const noexcept {
    return (bin - static_cast<double>(power_.size() / 2)) * bin_hz();
}

std::size_t line_spectrum::bin_of(double hz) const noexcept {
    const double bin = std::round(hz / bin_hz()) + static_cast<double>(power_.size() / 2);
    return static_cast<std::size_t>(std::clamp(bin, 0.0, static_cast<double>(power_.size() - 1)));
}

bool line_spectrum::is_line(std::size_t bin, double ratio) const noexcept {
    if (power_[bin] < ratio * noise(bin)) {
        return false;
    }
    const std::size_t first = bin > lobe_bins ? bin - lobe_bins : 0;
    const std::size_t last = std::min(bin + lobe_bins, power_.size() - 1);
    for (std::size_t k = first; k <= last; ++k) {
        if (power_[k] > power_[bin]) {
            return false;
        }
    }
    return true;
}

double line_spectrum::peak_hz(std::size_t bin) const noexcept {
    if (bin == 0 || bin + 1 >= power_.size()) {
        return hz_of(static_cast<double>(bin));
    }
    const double left = std::log(power_[bin - 1] + 1e-300), middle = std::log(power_[bin] + 1e-300),
                 right = std::log(power_[bin + 1] + 1e-300);
    const double bend = left - 2.0 * middle + right;
    const double shift = bend < 0.0 ? std::clamp(0.5 * (left - right) / bend, -0.5, 0.5) : 0.0;
    return hz_of(static_cast<double>(bin) + shift);
}

} // namespace tonewalk
