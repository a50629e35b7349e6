// SPDX-License-Identifier: GPL-3.0-or-later
#include <algorithm>

#include "speech.hpp"
#include "timing.hpp"
#include "tonewalk/scene/scene.hpp"
#include "tuning.hpp"

namespace tonewalk {
namespace {

struct lost_run {
    sample_index position, count;
};

std::vector<lost_run> lost_runs(const scene& whole) {
    std::vector<lost_run> runs;
    for (const scene_gap& gap : whole.receiver.gaps)
        runs.push_back({sample_at(gap.start_s, whole.rate_hz),
                        gap.samples > 0 ? gap.samples : samples_in(gap.duration_s, whole.rate_hz)});
    return runs;
}

std::vector<scene_segment> segments_of(const scene& whole) {
    if (!whole.segments.empty())
        return whole.segments;
    return {scene_segment{.duration_s = whole.duration_s, .samples = whole.samples}};
}

/// Lays segments along the time line and cuts them at the gaps.
class line_up {
public:
    explicit line_up(const scene& whole) : whole_{whole}, lost_{lost_runs(whole)} {}

    void add(const scene_segment& segment) {
        position_ += samples_in(segment.lost_s, whole_.rate_hz);
        const sample_index begin = position_;
        sample_index left =
            segment.samples > 0 ? segment.samples : samples_in(segment.duration_s, whole_.rate_hz);
        while (left > 0) {
            while (next_ < lost_.size() && lost_[next_].position < position_)
                ++next_;
            const bool gap_ahead = next_ < lost_.size();
            const sample_index run =
                gap_ahead ? std::min(left, lost_[next_].position - position_) : left;
            if (run > 0)
                append(segment, begin, run);
            left -= run;
            if (gap_ahead && left > 0)
                position_ += lost_[next_++].count;
        }
    }
    [[nodiscard]] std::vector<scene_stretch> take() { return std::move(stretches_); }

private:
    void append(const scene_segment& segment, sample_index begin, sample_index run) {
        const std::optional<utc_time> origin =
            segment.start_utc ? segment.start_utc : whole_.start_utc;
        const sample_index since = segment.start_utc ? position_ - begin : position_;
        scene_stretch next{first_, position_, run,
                           segment.centre_hz ? segment.centre_hz : whole_.centre_hz, std::nullopt};
        if (origin)
            next.start_utc = moved_by(*origin, static_cast<double>(since) / whole_.rate_hz);
        stretches_.push_back(next);
        first_ += run;
        position_ += run;
    }

    const scene& whole_;
    std::vector<lost_run> lost_;
    std::size_t next_ = 0;
    sample_index first_ = 0, position_ = 0;
    std::vector<scene_stretch> stretches_;
};

} // namespace

std::vector<scene_stretch> scene_layout(const scene& whole) {
    line_up line{whole};
    for (const scene_segment& segment : segments_of(whole))
        line.add(segment);
    return line.take();
}

sample_index stored_samples(const scene& whole) {
    sample_index sum = 0;
    for (const scene_segment& segment : segments_of(whole))
        sum +=
            segment.samples > 0 ? segment.samples : samples_in(segment.duration_s, whole.rate_hz);
    return sum;
}

double scene_span_s(const scene& whole) {
    const std::vector<scene_stretch> stretches = scene_layout(whole);
    return stretches.empty()
               ? 0.0
               : static_cast<double>(stretches.back().position + stretches.back().count) /
                     whole.rate_hz;
}

double farthest_sideband_hz(const scene_carrier& carrier) {
    double farthest = carrier.speech_percent > 0.0 ? speech_like::highest_hz : 0.0;
    for (const scene_tone& tone : carrier.tones) {
        farthest = std::max(farthest, tone.frequency_hz);
        for (const scene_harmonic& each : tone.harmonics)
            farthest = std::max(farthest, tone.frequency_hz * each.order);
    }
    for (const scene_hum& each : carrier.hum)
        farthest = std::max(farthest, each.frequency_hz);
    return farthest;
}

std::optional<carrier_tuning> tuned(const scene& whole, const scene_carrier& carrier,
                                    std::optional<double> centre_hz) {
    const double home_hz = whole.centre_hz.value_or(0.0);
    const double here_hz = centre_hz.value_or(home_hz);
    carrier_tuning at{carrier.offset_hz, 0.0};
    if (!carrier.follows_centre)
        at.offset_hz += home_hz - here_hz;
    if (whole.centre_hz)
        at.frequency_hz = here_hz + at.offset_hz;
    const double swing_hz =
        carrier.wobble_hz + std::max(0.0, carrier.drift_hz_s * scene_span_s(whole));
    const double sink_hz =
        carrier.wobble_hz + std::max(0.0, -carrier.drift_hz_s * scene_span_s(whole));
    const double reach_hz = farthest_sideband_hz(carrier);
    const double lowest_hz = whole.format.is_complex ? -whole.rate_hz / 2.0 : 0.0;
    const bool fits = at.offset_hz + swing_hz + reach_hz < whole.rate_hz / 2.0 &&
                      at.offset_hz - sink_hz - reach_hz > lowest_hz;
    return fits ? std::optional{at} : std::nullopt;
}

} // namespace tonewalk
