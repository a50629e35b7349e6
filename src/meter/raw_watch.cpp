// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/meter/raw_watch.hpp"

#include <algorithm>
#include <cmath>
#include <numbers>

#include <fmt/core.h>

#include "tonewalk/base/decibel.hpp"

namespace tonewalk {
namespace {

constexpr double clipped_ratio = 4.0;    // the extreme code over the mean of the next three
constexpr std::int64_t least_codes = 64; // both rails together; fewer are not judged

/// Samples on a rail that holds more than a signal's own turning points put there. A clean sine's
/// extreme code holds 3.0 times what the next three hold on average.
std::uint64_t clipped_on(const rail_tally& rail) {
    const double others =
        static_cast<double>(rail.counts[1] + rail.counts[2] + rail.counts[3]) / 3.0;
    const auto extreme = static_cast<double>(rail.counts[0]);
    // Poisson scatter of a handful of peaks is no clipping: five standard deviations above the
    // rule.
    const bool more_than_chance =
        extreme > clipped_ratio * others + 5.0 * std::sqrt(clipped_ratio * (others + 1.0));
    return extreme > clipped_ratio * others && more_than_chance ? rail.counts[0] : 0;
}

double power_db(double power) {
    return decibel::from_power_ratio(power).db();
}

} // namespace

raw_watch::raw_watch(const stream_facts& facts) : facts_{&facts} {}

void raw_watch::add(const raw_counts& counts, std::size_t samples) {
    for (const cell_sums& sums : counts.cells) {
        total_.i += sums.i;
        total_.q += sums.q;
        total_.ii += sums.ii;
        total_.qq += sums.qq;
        total_.iq += sums.iq;
        total_.peak_power = std::max(total_.peak_power, sums.peak_power);
        total_.peak_component = std::max(total_.peak_component, sums.peak_component);
    }
    positive_.merge(counts.positive);
    negative_.merge(counts.negative);
    samples_ += samples;
    for (const sample_range& range : counts.non_finite) {
        non_finite_ += static_cast<std::uint64_t>(range.count);
    }
}

raw_result raw_watch::result() const {
    raw_result r;
    r.samples = static_cast<sample_index>(samples_);
    const double n = static_cast<double>(samples_ - std::min(samples_, non_finite_));
    if (n <= 0.0) {
        return r;
    }
    const double mean_i = total_.i / n, mean_q = total_.q / n;
    const double power_i = total_.ii / n, power_q = total_.qq / n;
    const bool is_complex = facts_->format.is_complex;
    // A real sine of amplitude 1 is 0 dBFS: its analytic signal has twice the power of its samples.
    r.rms_dbfs = power_db(is_complex ? power_i + power_q : 2.0 * power_i);
    r.peak_dbfs = power_db(total_.peak_power);
    r.peak_component_dbfs = power_db(total_.peak_component * total_.peak_component);
    r.dc_dbfs = power_db(mean_i * mean_i + mean_q * mean_q);
    const double var_i = power_i - mean_i * mean_i, var_q = power_q - mean_q * mean_q;
    if (is_complex && var_i > 0.0 && var_q > 0.0) {
        r.iq_gain_error_db = power_db(var_i / var_q);
        const double covariance = total_.iq / n - mean_i * mean_q;
        const double sine = std::clamp(covariance / std::sqrt(var_i * var_q), -1.0, 1.0);
        r.iq_phase_error_deg = std::asin(sine) * 180.0 / std::numbers::pi;
    }
    r.clipping_judged = positive_.outermost + negative_.outermost + 1 >= least_codes;
    if (r.clipping_judged) {
        r.clipped_samples = clipped_on(positive_) + clipped_on(negative_);
    }
    if (r.clipped_samples > 0) {
        r.doubts.add(
            {note_code::clipped, severity::warning,
             fmt::format("{} component samples stand on the extreme code ({:.3f} % of all)",
                         r.clipped_samples, 50.0 * static_cast<double>(r.clipped_samples) / n),
             "lower the gain and record again: peaks and distortion are not to be trusted"});
    }
    if (non_finite_ > 0) {
        r.doubts.add(
            {note_code::non_finite_samples, severity::warning,
             fmt::format("some {} samples are not numbers and were taken as zero", non_finite_),
             "records that they touch are null; find out what wrote them"});
    }
    return r;
}

sheet describe(const raw_result& r) {
    sheet s;
    s.add("rms_dbfs", "dBFS", r.rms_dbfs);
    s.add("peak_dbfs", "dBFS", r.peak_dbfs);
    s.add("peak_component_dbfs", "dBFS", r.peak_component_dbfs);
    s.add("clipped_samples", "",
          r.clipping_judged ? cell{static_cast<std::int64_t>(r.clipped_samples)} : cell{});
    s.add("dc_dbfs", "dBFS", r.dc_dbfs);
    s.add("iq_gain_error_db", "dB", r.iq_gain_error_db);
    s.add("iq_phase_error_deg", "deg", r.iq_phase_error_deg);
    return s;
}

} // namespace tonewalk
