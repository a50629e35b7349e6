// SPDX-License-Identifier: GPL-3.0-or-later
#include "line_spectrum.hpp"

#include <algorithm>
#include <cassert>
#include <cmath>
#include <numbers>

#include "tonewalk/maths/quantile.hpp"

namespace tonewalk {
namespace {

constexpr std::size_t most_noise_run = 256;
constexpr double least_power = 1e-30; // of a noise bin: keeps silence from dividing by zero

double median_of_three(double a, double b, double c) {
    return std::max(std::min(a, b), std::min(std::max(a, b), c));
}

} // namespace

line_spectrum::line_spectrum(std::size_t size, double rate_hz)
    : rate_hz_{rate_hz}, power_(size, 0.0), transform_{size} {
    noise_bins_ = transform_->noise_bins();
}

void line_spectrum::add(std::span<const cf32> segment) {
    const std::size_t size = power_.size(), half = size / 2;
    const std::span<const cf32> out = transform_->run(segment);
    for (std::size_t k = 0; k < size; ++k) { // the negative frequencies first
        const cf32 z = out[k < half ? k + size - half : k - half];
        const double re = static_cast<double>(z.real()), im = static_cast<double>(z.imag());
        power_[k] += re * re + im * im;
    }
    ++segments_;
}

void line_spectrum::finish() {
    transform_.reset();
    const double segments = static_cast<double>(std::max<std::size_t>(1, segments_));
    for (double& p : power_) {
        p /= segments;
    }
    find_noise();
}

void line_spectrum::merge(const line_spectrum& other) {
    assert(other.size() == size() && segments_ + other.segments_ > 0);
    const double share =
        static_cast<double>(other.segments_) / static_cast<double>(segments_ + other.segments_);
    for (std::size_t k = 0; k < power_.size(); ++k) {
        power_[k] += share * (other.power_[k] - power_[k]);
    }
    segments_ += other.segments_;
    find_noise();
}

void line_spectrum::find_noise() {
    noise_run_ = std::clamp<std::size_t>(power_.size() / 8, 8, most_noise_run);
    std::vector<double> medians;
    for (std::size_t first = 0; first < power_.size(); first += noise_run_) {
        const std::size_t count = std::min(noise_run_, power_.size() - first);
        const std::span<const double> run{power_.data() + first, count};
        medians.push_back(median({run.begin(), run.end()}));
    }
    // One segment's powers are exponential, whose median is ln 2 of the mean; many segments' come
    // to meet it.
    const double segments = static_cast<double>(std::max<std::size_t>(1, segments_));
    const double share = 1.0 - (1.0 - std::numbers::ln2) / segments;
    noise_.resize(medians.size());
    for (std::size_t k = 0; k < medians.size(); ++k) { // a crowd of lines lifts one run: not three
        const double left = medians[k > 0 ? k - 1 : k];
        const double right = medians[std::min(k + 1, medians.size() - 1)];
        noise_[k] = std::max(median_of_three(left, medians[k], right) / share, least_power);
    }
}

double line_spectrum::floor_density() const {
    const double floor = median(noise_);
    return floor > least_power ? floor / (noise_bins_ * bin_hz()) : 0.0;
}

double line_spectrum::hz_of(double bin) const noexcept {
    const std::size_t middle = power_.size() / 2;
    return (bin - static_cast<double>(middle)) * bin_hz();
}

std::size_t line_spectrum::bin_of(double hz) const noexcept {
    const std::size_t middle = power_.size() / 2;
    const double bin = std::round(hz / bin_hz()) + static_cast<double>(middle);
    return static_cast<std::size_t>(std::clamp(bin, 0.0, static_cast<double>(power_.size() - 1)));
}

bool line_spectrum::is_line(std::size_t bin) const noexcept {
    if (power_[bin] < line_ratio * noise(bin)) {
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

std::optional<std::size_t> line_spectrum::strongest(double low_hz, double high_hz) const noexcept {
    std::optional<std::size_t> best;
    for (std::size_t k = bin_of(low_hz), last = bin_of(high_hz); k <= last; ++k) {
        if ((!best || power_[k] > power_[*best]) && is_line(k)) {
            best = k;
        }
    }
    return best;
}

line_spectrum::peak line_spectrum::peak_at(std::size_t bin) const noexcept {
    const double at = static_cast<double>(bin);
    if (bin == 0 || bin + 1 >= power_.size()) {
        return {hz_of(at), power_[bin]};
    }
    const double left = std::log(power_[bin - 1] + 1e-300), middle = std::log(power_[bin] + 1e-300),
                 right = std::log(power_[bin + 1] + 1e-300);
    const double bend = left - 2.0 * middle + right;
    const double shift = bend < 0.0 ? std::clamp(0.5 * (left - right) / bend, -0.5, 0.5) : 0.0;
    return {hz_of(at + shift), std::exp(middle - 0.25 * (left - right) * shift)};
}

} // namespace tonewalk
