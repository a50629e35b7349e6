// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/maths/window.hpp"

#include <array>
#include <cassert>
#include <cmath>
#include <complex>

#include "tonewalk/base/decibel.hpp"
#include "two_pi.hpp"

namespace tonewalk {
namespace {

/// |sum v[n] e^(-j 2 pi bins n/N)|.
template <class Value>
double transform_magnitude(std::size_t size, double bins, Value value) {
    std::complex<double> sum{};
    for (std::size_t n = 0; n < size; ++n) {
        const double turn = bins * static_cast<double>(n) / static_cast<double>(size);
        sum += value(n) * std::polar(1.0, -two_pi * turn);
    }
    return std::abs(sum);
}

/// a0 - a1 cos x + a2 cos 2x - ..., the multiples by their recurrence.
double cosine_sum(const std::vector<double>& coefficients, double cosine) {
    double before = 1.0, now = cosine; // cos 0, cos x
    double sum = coefficients.front(), sign = -1.0;
    for (std::size_t k = 1; k < coefficients.size(); ++k) {
        sum += sign * coefficients[k] * now;
        sign = -sign;
        const double next = 2.0 * cosine * now - before;
        before = now;
        now = next;
    }
    return sum;
}

} // namespace

window::window(std::size_t size, std::span<const double> coefficients)
    : values_(size), coefficients_(coefficients.begin(), coefficients.end()) {
    assert(size > 0 && !coefficients.empty());
    for (std::size_t n = 0; n <= size / 2; ++n) {
        const double turn = static_cast<double>(n) / static_cast<double>(size);
        values_[n] = cosine_sum(coefficients_, std::cos(two_pi * turn));
    }
    for (std::size_t n = size / 2 + 1; n < size; ++n) {
        values_[n] = values_[size - n];
    }
}

double window::coherent_gain() const noexcept {
    double sum = 0.0;
    for (const double w : values_) {
        sum += w;
    }
    return sum / static_cast<double>(size());
}

double window::noise_bandwidth_bins() const noexcept {
    double sum = 0.0, squares = 0.0;
    for (const double w : values_) {
        sum += w;
        squares += w * w;
    }
    return static_cast<double>(size()) * squares / (sum * sum);
}

double window::scalloping_loss_db() const noexcept {
    return -decibel::from_amplitude_ratio(std::abs(response(0.5))).db();
}

double window::power_correlation(double bins) const noexcept {
    const auto squared = [this](std::size_t n) { return values_[n] * values_[n]; };
    const double ratio =
        transform_magnitude(size(), bins, squared) / transform_magnitude(size(), 0.0, squared);
    return ratio * ratio;
}

double window::response(double bins) const noexcept {
    const double centre = static_cast<double>(size()) / 2.0;
    double sum = 0.0, total = 0.0;
    for (std::size_t n = 0; n < size(); ++n) {
        const double turn = (static_cast<double>(n) - centre) / static_cast<double>(size());
        sum += values_[n] * std::cos(two_pi * bins * turn);
        total += values_[n];
    }
    return sum / total;
}

double hann_overlap_correlation(double shift) noexcept {
    const double x = std::abs(shift);
    return x >= 1.0
               ? 0.0
               : (1.0 - x) * (2.0 + std::cos(two_pi * x)) / 3.0 + std::sin(two_pi * x) / two_pi;
}

overlap_inflation hann_overlap_inflation(double shift) noexcept {
    overlap_inflation total;
    for (double lag = shift; lag > 0.0 && lag < 1.0; lag += shift) {
        const double correlation = hann_overlap_correlation(lag);
        total.amplitude += 2.0 * correlation;
        total.power += 2.0 * correlation * correlation;
    }
    return total;
}

window rectangular_window(std::size_t size) {
    return {size, std::array{1.0}};
}
window hann_window(std::size_t size) {
    return {size, std::array{0.5, 0.5}};
}
window hamming_window(std::size_t size) {
    return {size, std::array{0.54, 0.46}};
}
window blackman_window(std::size_t size) {
    return {size, std::array{0.42, 0.5, 0.08}};
}
window blackman_harris_window(std::size_t size) {
    return {size, std::array{0.35875, 0.48829, 0.14128, 0.01168}};
}
window nuttall_window(std::size_t size) {
    return {size, std::array{0.3635819, 0.4891775, 0.1365995, 0.0106411}};
}

} // namespace tonewalk
