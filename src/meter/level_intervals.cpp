// SPDX-License-Identifier: GPL-3.0-or-later
#include "level_intervals.hpp"

#include <algorithm>
#include <cmath>

#include "line_moments.hpp"
#include "tonewalk/base/decibel.hpp"
#include "tonewalk/maths/distribution.hpp"
#include "tonewalk/meter/envelope_suppression.hpp"

namespace tonewalk {
namespace {

const double symmetric_from = decibel::from_db(15.0).power_ratio(); // line SNR
const double suppressed_below = decibel::from_db(-0.1).amplitude_ratio();

double amplitude_db(double amplitude) {
    return amplitude > 0.0 ? decibel::from_amplitude_ratio(amplitude).db() : not_measured;
}

/// Limits of a ratio from the limits of both its parts, on a logarithmic scale: each side's
/// distances added in quadrature.
interval_estimate ratio_percent(const interval_estimate& above, const interval_estimate& below) {
    const double per_db = std::log(10.0) / 20.0;
    const double middle = 100.0 * std::exp((above.value - below.value) * per_db);
    const double down = std::hypot(above.value - above.low95, below.high95 - below.value) * per_db;
    const double up = std::hypot(above.high95 - above.value, below.value - below.low95) * per_db;
    interval_estimate r{middle, middle * std::exp(-down), middle * std::exp(up), not_measured};
    if (!std::isnan(above.u95) && !std::isnan(below.u95)) {
        r.u95 = (r.high95 - r.low95) / 2.0;
    }
    return r;
}

/// A background is taken off in power; what it could hide is not detected but bounded.
line_power without(const background_line& background, line_power line) {
    line.power -= background.power;
    line.detected = line.detected && !hidden_by(background, line.power);
    return line;
}

/// Why a line shows only a bound.
std::uint32_t weakness(const line_power& found, const line_power& left, record_flag weak) {
    if (left.detected) {
        return 0;
    }
    return static_cast<std::uint32_t>(found.detected ? flag_background_limited : weak);
}

} // namespace

void level_intervals::complete(level_log& log, const common& c) {
    log.carrier_bound = c.background.carrier.bound;
    log.tone_bound = c.background.tone.bound;
    for (level_record& r : log.records) {
        r.tone.power /= c.tone_response * c.tone_response;
        r.tone.sigma /= c.tone_response;
    }
    correct_incidental_phase(log, 0.5 * c.background.tone.power);
    for (std::size_t k = 0; k < log.records.size(); ++k) {
        fill(log, log.records[k], basis_[k], c);
    }
    basis_ = {};
}

/// Where the carrier was too weak to tell amplitude from phase, the share of incidental phase that
/// the other records show is taken off in power; its own uncertainty becomes a bound.
void level_intervals::correct_incidental_phase(level_log& log, double background_power) {
    double in_phase = 0.0, across = 0.0, across_variance = 0.0;
    for (std::size_t k = 0; k < log.records.size(); ++k) {
        const level_record& r = log.records[k];
        if (basis_[k].split && r.tone.detected) {
            in_phase += r.tone.power - background_power;
            across += basis_[k].across_power - background_power;
            const double n2 = 2.0 * r.noise_power;
            across_variance += n2 * n2 + 2.0 * n2 * std::max(0.0, basis_[k].across_power);
        }
    }
    if (in_phase <= 0.0) {
        return;
    }
    const double share = std::max(0.0, across / in_phase);
    const double share_u95 = two_sided_95 * std::sqrt(across_variance) / in_phase;
    incidental_bound_ = share_u95 / 2.0; // of an amplitude
    for (std::size_t k = 0; k < log.records.size(); ++k) {
        if (!basis_[k].split) {
            log.records[k].tone.power /= 1.0 + share;
            log.records[k].tone.sigma /= std::sqrt(1.0 + share);
        }
    }
}

interval_estimate level_intervals::level(const line_power& line, double raw_ratio, int degrees,
                                         double unit, double line_snr, const bounds& b,
                                         double independent) {
    // Less power than 97.5 % of noise alone has would bound the line by nothing at all, and leave
    // no bound to show: take a little more.
    const double least_ratio = degrees == 2 ? 0.03 : 0.13;
    const amplitude_limits::pair limits =
        limits_(std::max(raw_ratio, least_ratio), degrees, independent);
    interval_estimate r;
    r.high95 = amplitude_db(limits.high * unit * (1.0 + b.relative) + b.absolute);
    if (!line.detected || line.power <= 0.0) {
        return r;
    }
    r.value = amplitude_db(std::sqrt(line.power));
    r.low95 = amplitude_db(limits.low * unit * (1.0 - b.relative) - b.absolute);
    // The interval is of the truth, the value an unbiased power: near the floor the value may leave
    // it.
    r.low95 = std::fmin(r.low95, r.value);
    r.high95 = std::fmax(r.high95, r.value);
    if (line_snr >= symmetric_from && !std::isnan(r.low95)) {
        r.u95 = (r.high95 - r.low95) / 2.0;
    }
    return r;
}

void level_intervals::fill(level_log& log, level_record& r, const record_basis& basis,
                           const common& c) {
    if (std::isnan(r.carrier.power)) {
        return;
    }
    const double n = r.noise_power, window_s = log.window_s;
    const double offset_bins = std::abs(c.carrier_offset_hz) * window_s;
    const double carrier_amplitude = std::sqrt(std::max(0.0, r.carrier.power));
    const double droop = 1.0 - hann_response(std::min(0.9, basis.unknown_hz * window_s));
    const bounds on_carrier{c.dc_amplitude * hann_leakage_bound(offset_bins) +
                                c.image_ratio * carrier_amplitude *
                                    hann_leakage_bound(2.0 * offset_bins) +
                                c.background.carrier.bound,
                            droop};
    const line_power carrier = without(c.background.carrier, r.carrier);
    r.carrier_dbfs = level(carrier, (r.carrier.power + n) / n, 2, std::sqrt(n / 2.0),
                           carrier.power / n, on_carrier, basis.independent);
    r.flags |= weakness(r.carrier, carrier, flag_weak_carrier);
    r.carrier = carrier;
    if (c.envelope_noise_bandwidth_hz > 0.0) {
        const double noise_in_channel =
            n / log.noise_bandwidth_hz() * c.envelope_noise_bandwidth_hz;
        const bool low = envelope_depth_factor(std::max(0.0, r.carrier.power) / noise_in_channel) <=
                         suppressed_below;
        r.flags |= low ? static_cast<std::uint32_t>(flag_envelope_suppressed) : 0U;
    }
    if (!log.has_tone()) {
        return;
    }
    const double tone_bins = log.tone_hz * window_s;
    const double tone_amplitude = std::sqrt(std::max(0.0, r.tone.power));
    const double dc_leak =
        hann_leakage_bound(offset_bins - tone_bins) + hann_leakage_bound(offset_bins + tone_bins);
    // The image's carrier and its two lines, each mirrored about the centre, against either tone
    // line.
    const double image_leak =
        carrier_amplitude * (hann_leakage_bound(2.0 * offset_bins - tone_bins) +
                             hann_leakage_bound(2.0 * offset_bins + tone_bins)) +
        tone_amplitude * (hann_leakage_bound(2.0 * offset_bins) +
                          hann_leakage_bound(2.0 * (offset_bins - tone_bins)));
    const bounds on_tone{c.dc_amplitude * dc_leak + c.image_ratio * image_leak +
                             c.background.tone.bound,
                         droop + (basis.split ? 0.0 : incidental_bound_)};
    // As it was found, before corrections that scale signal and noise alike.
    const double tone_noise = r.tone.sigma * r.tone.sigma; // of one quadrature
    const int degrees = basis.split ? 2 : 4;
    const double raw_ratio = r.tone.power / (degrees * tone_noise) + 1.0;
    // Of a foreign line's power, seen in both sidebands together, a split keeps half on average.
    background_line tone_background = c.background.tone;
    tone_background.power *= basis.split ? 0.5 : 1.0;
    const line_power tone = without(tone_background, r.tone);
    const double tone_snr = tone.power / (4.0 * tone_noise);
    r.tone_dbfs =
        level(tone, raw_ratio, degrees, r.tone.sigma, tone_snr, on_tone, basis.independent);
    r.flags |= weakness(r.tone, tone, flag_weak_tone);
    r.tone = tone;
    r.tone_snr_db = tone_snr > 0.0 ? decibel::from_power_ratio(tone_snr).db() : not_measured;
    if (r.carrier.detected && r.tone.detected && !std::isnan(r.tone_dbfs.value)) {
        r.depth_percent = ratio_percent(r.tone_dbfs, r.carrier_dbfs);
    } else if (r.carrier.detected && !std::isnan(r.carrier_dbfs.low95)) {
        r.depth_percent.high95 =
            100.0 * decibel::from_db(r.tone_dbfs.high95 - r.carrier_dbfs.low95).amplitude_ratio();
    }
}

} // namespace tonewalk
