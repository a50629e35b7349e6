// SPDX-License-Identifier: GPL-3.0-or-later
#include "am_lines.hpp"

#include <cmath>

namespace tonewalk {
namespace {

/// Takes out what a Hann window leaks from each of three evenly spaced lines into the others.
three_lines without_leakage(const three_lines& m, double spacing_bins) {
    const double near = hann_response(spacing_bins), far = hann_response(2.0 * spacing_bins);
    const cf64 sum = (m.upper + m.lower - 2.0 * near * m.carrier) / (1.0 + far - 2.0 * near * near);
    const cf64 difference = (m.upper - m.lower) / (1.0 - far);
    return {m.carrier - near * sum, 0.5 * (sum + difference), 0.5 * (sum - difference)};
}

power_bend bend_of_power(const line_moments::series& x) {
    return {2.0 * (x.first * std::conj(x.value)).real(),
            2.0 * ((x.second * std::conj(x.value)).real() + std::norm(x.first))};
}

} // namespace

split_power split_tone(const three_lines& lines, double line_noise) noexcept {
    const cf64 c = lines.carrier / std::abs(lines.carrier);
    const cf64 upper = lines.upper * std::conj(c), lower = std::conj(lines.lower) * c;
    const double in_phase = std::norm(upper + lower) - 2.0 * line_noise;
    const double across = std::norm(upper - lower) - 2.0 * line_noise;
    const double v = line_noise / (2.0 * (std::norm(lines.carrier) - line_noise));
    return {((1.0 - v) * in_phase - v * across) / (1.0 - 2.0 * v),
            ((1.0 - v) * across - v * in_phase) / (1.0 - 2.0 * v)};
}

am_lines::am_lines(const sample_runs& weighted, const config& c)
    : carrier_{weighted, c.rate_hz, c.carrier_hz, c.orders}, tone_hz_{c.tone_hz} {
    if (tone_hz_) {
        upper_ = line_moments{weighted, c.rate_hz, c.carrier_hz + *tone_hz_, c.orders};
        lower_ = line_moments{weighted, c.rate_hz, c.carrier_hz - *tone_hz_, c.orders};
        tone_bins_ = *tone_hz_ * static_cast<double>(weighted.samples()) / c.rate_hz;
    }
}

three_lines am_lines::at(double hz, double slope_hz_s) const {
    if (!tone_hz_) {
        return {carrier_.at(hz, slope_hz_s), {}, {}};
    }
    return without_leakage({carrier_.at(hz, slope_hz_s), upper_.at(hz + *tone_hz_, slope_hz_s),
                            lower_.at(hz - *tone_hz_, slope_hz_s)},
                           tone_bins_);
}

double am_lines::carrier_peak_hz(double reach_hz) const {
    constexpr int steps = 24;
    double low = carrier_.f0_hz() - reach_hz, high = carrier_.f0_hz() + reach_hz;
    double hz = carrier_.f0_hz();
    for (int k = 0; k < steps; ++k) { // Newton's steps, kept between what is uphill on either side
        const power_bend p = bend_of_power(carrier_.derivatives(hz));
        (p.slope > 0.0 ? low : high) = hz;
        const double next = p.bend < 0.0 ? hz - p.slope / p.bend : low - 1.0;
        const double before = hz;
        hz = next > low && next < high ? next : 0.5 * (low + high);
        if (std::abs(hz - before) < 1e-9 * reach_hz) {
            break;
        }
    }
    return hz;
}

power_bend am_lines::tone_bend(double carrier_hz) const {
    const power_bend u = bend_of_power(upper_.derivatives(carrier_hz + *tone_hz_));
    const power_bend l = bend_of_power(lower_.derivatives(carrier_hz - *tone_hz_));
    return {u.slope - l.slope, u.bend + l.bend};
}

} // namespace tonewalk
