// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/meter/raw_watch.hpp"

#include <algorithm>
#include <bit>
#include <cmath>
#include <limits>
#include <optional>

#include <fmt/core.h>

#include "tonewalk/base/decibel.hpp"

namespace tonewalk {
namespace {

constexpr double clipped_ratio = 4.0;    // the extreme code over the mean of those next to it
constexpr double clipped_sigmas = 5.0;   // beyond what the scatter of a few peaks explains
constexpr std::int64_t least_codes = 64; // both rails together; fewer are not judged

/// The largest code that the format can hold, or that floats made from integers stop at.
std::int64_t full_scale_code(const stream_facts& facts) {
    if (facts.format.is_float()) {
        return std::bit_cast<std::uint32_t>(1.0F) >> 8U;
    }
    const std::size_t stored_bits = 8 * facts.format.component_bytes();
    const std::size_t bits = facts.code_bits != 0 ? facts.code_bits : stored_bits;
    return (std::int64_t{1} << (bits - 1)) - 1;
}

/// Steps from one code that occurs to the next: 1, or more where samples lie on a coarser grid or
/// are few; 1 where one code alone occurs.
std::int64_t spacing_of(const rail_tally& rail) {
    std::int64_t least = std::numeric_limits<std::int64_t>::max();
    for (std::size_t k = 1; k < rail.codes.size() && rail.codes[k] > 0; ++k) {
        least = std::min(least, rail.codes[k - 1] - rail.codes[k]);
    }
    return rail.codes[1] > 0 ? least : 1;
}

/// Component samples on a rail that holds more of them than a signal's own turning points put
/// there. None are sharper than a sine's, whose outermost d steps hold a share that grows with the
/// root of d: of two codes side by side the outer one 3.0 times what the next three hold on
/// average. A rail of one code only is clipped at the format's full scale; nothing can be told
/// elsewhere.
std::optional<std::uint64_t> clipped_on(const rail_tally& rail, std::int64_t full_scale) {
    double others = 0.0, occupied = 0.0;
    std::int64_t innermost = rail.outermost();
    for (std::size_t k = 1; k < rail.codes.size() && rail.codes[k] > 0; ++k) {
        others += static_cast<double>(rail.counts[k]);
        occupied += 1.0;
        innermost = rail.codes[k];
    }
    const auto found = static_cast<double>(rail.counts[0]);
    if (occupied == 0.0) {
        if (found <= clipped_sigmas * std::sqrt(clipped_ratio)) {
            return 0; // a handful is chance
        }
        return rail.outermost() < full_scale ? std::nullopt : std::optional{rail.counts[0]};
    }
    const std::int64_t steps = (rail.outermost() - innermost) / spacing_of(rail);
    const double share = 1.0 / std::sqrt(1.0 + static_cast<double>(steps)); // a sine's, outermost
    const double margin = clipped_ratio / 3.0;
    const double expected = margin * others * share / (1.0 - share);
    const double most = expected + clipped_sigmas * std::sqrt(expected + clipped_ratio);
    return found > std::max(most, clipped_ratio * others / occupied) ? rail.counts[0] : 0;
}

double power_db(double power) {
    return decibel::from_power_ratio(power).db();
}

note clipped_note(std::uint64_t clipped, double samples, bool is_complex) {
    const double components = is_complex ? 2.0 * samples : samples;
    return {note_code::clipped, severity::warning,
            fmt::format("{} values stand on the outermost code ({:.3g} % of all)", clipped,
                        100.0 * static_cast<double>(clipped) / components),
            "record again with less gain: peaks and distortion are not to be trusted"};
}

note non_finite_note(std::uint64_t zeroed) {
    return {note_code::non_finite_samples, severity::warning,
            fmt::format("{} samples are not numbers and were taken as zero", zeroed),
            "records that they touch are null; find out what wrote them"};
}

} // namespace

raw_watch::raw_watch(const stream_facts& facts) : facts_{&facts} {}

void raw_watch::add(const raw_counts& counts, std::size_t samples) {
    for (const cell_sums& sums : counts.cells) {
        total_.i += sums.i;
        total_.q += sums.q;
        total_.ii += sums.ii;
        total_.qq += sums.qq;
        total_.peak_power = std::max(total_.peak_power, sums.peak_power);
        total_.peak_component = std::max(total_.peak_component, sums.peak_component);
    }
    positive_.merge(counts.positive);
    negative_.merge(counts.negative);
    samples_ += samples;
    non_finite_ += counts.zeroed;
}

raw_result raw_watch::result() const {
    raw_result r;
    r.samples = static_cast<sample_index>(samples_);
    if (samples_ > non_finite_) {
        judge_levels(r);
        judge_clipping(r);
    }
    if (non_finite_ > 0) {
        r.doubts.add(non_finite_note(non_finite_));
    }
    return r;
}

void raw_watch::judge_levels(raw_result& r) const {
    const double n = static_cast<double>(samples_ - non_finite_);
    const double mean_i = total_.i / n, mean_q = total_.q / n;
    const double power_i = total_.ii / n, power_q = total_.qq / n;
    const bool is_complex = facts_->format.is_complex;
    // A real sine of amplitude 1 is 0 dBFS: its analytic signal has twice the power of its samples.
    r.rms_dbfs = power_db(is_complex ? power_i + power_q : 2.0 * power_i);
    r.peak_dbfs = power_db(total_.peak_power);
    r.peak_component_dbfs = power_db(total_.peak_component * total_.peak_component);
    r.headroom_db = 0.0 - r.peak_component_dbfs;
    r.dc_dbfs = power_db(mean_i * mean_i + mean_q * mean_q);
}

void raw_watch::judge_clipping(raw_result& r) const {
    const std::int64_t codes = std::max<std::int64_t>(0, positive_.outermost()) +
                               std::max<std::int64_t>(0, negative_.outermost());
    if (codes / std::min(spacing_of(positive_), spacing_of(negative_)) + 1 < least_codes) {
        return;
    }
    const std::int64_t full_scale = full_scale_code(*facts_);
    const auto above = clipped_on(positive_, full_scale), below = clipped_on(negative_, full_scale);
    r.clipped_samples = above.value_or(0) + below.value_or(0);
    r.clipping_judged = r.clipped_samples > 0 || (above && below);
    if (r.clipped_samples > 0) {
        r.doubts.add(clipped_note(r.clipped_samples, static_cast<double>(samples_ - non_finite_),
                                  facts_->format.is_complex));
    }
}

sheet describe(const raw_result& r) {
    sheet s;
    s.add("rms_dbfs", "dBFS", r.rms_dbfs);
    s.add("peak_dbfs", "dBFS", r.peak_dbfs);
    s.add("peak_component_dbfs", "dBFS", r.peak_component_dbfs);
    s.add("headroom_db", "dB", r.headroom_db);
    s.add("clipped_samples", "",
          r.clipping_judged ? cell{static_cast<std::int64_t>(r.clipped_samples)} : cell{});
    s.add("dc_dbfs", "dBFS", r.dc_dbfs);
    return s;
}

} // namespace tonewalk
