// SPDX-License-Identifier: GPL-3.0-or-later
#include "dc_line.hpp"

#include <cmath>

#include "line_transform.hpp"
#include "search_survey.hpp"
#include "segments.hpp"

namespace tonewalk {
namespace {

constexpr double least_still = 0.5; // share of the power that keeps its phase

/// Modulation puts a line on both sides of its carrier.
bool is_sideband(const line_spectrum& survey, double power, double carrier_hz) {
    const double partner_hz = 2.0 * carrier_hz, reach_hz = 1.5 * survey.bin_hz();
    if (std::abs(partner_hz) >= -survey.hz_of(0.0)) {
        return false;
    }
    const auto partner = survey.strongest(partner_hz - reach_hz, partner_hz + reach_hz);
    return partner && survey.power(*partner) * mirror_ratio > power &&
           survey.power(*partner) < mirror_ratio * power;
}

double still_line(const looked_at& what, const line_spectrum& survey, double carrier_hz) {
    const auto bin = survey.strongest(-survey.bin_hz(), survey.bin_hz());
    if (!bin || std::abs(survey.peak_at(*bin).hz) > 0.5 * survey.bin_hz() ||
        is_sideband(survey, survey.power(*bin), carrier_hz)) {
        return 0.0;
    }
    const line_transform transform{survey.size()};
    const std::span<const float> weights = transform.weights();
    cf64 sum{};
    double power = 0.0, segments = 0.0;
    for_each_segment(what, survey.size(), [&](std::span<const cf32> segment) {
        cf64 line{};
        for (std::size_t n = 0; n < segment.size(); ++n) {
            line += cf64{segment[n] * weights[n]};
        }
        sum += line;
        power += std::norm(line);
        ++segments;
    });
    const cf64 mean = sum / segments;
    return std::norm(mean) > least_still * power / segments ? std::abs(mean) : 0.0;
}

} // namespace

double dc_line(const looked_at& what, const line_spectrum& survey, double carrier_hz) {
    if (std::abs(carrier_hz) > 2.0 * centre_bins * survey.bin_hz()) {
        return still_line(what, survey, carrier_hz);
    }
    const std::size_t finer = 2 * survey.size();
    return finer <= finest_segment(what.frames) ? dc_line(what, survey_of(what, finer), carrier_hz)
                                                : 0.0;
}

} // namespace tonewalk
