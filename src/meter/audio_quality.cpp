// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/meter/audio_quality.hpp"

#include <algorithm>
#include <cmath>
#include <complex>
#include <numbers>
#include <numeric>

#include "tonewalk/base/decibel.hpp"
#include "tonewalk/maths/quantile.hpp"

namespace tonewalk {
namespace {

constexpr std::size_t gap_samples = 16;
constexpr unsigned last_harmonic = 10;
constexpr double detection_ratio = 10.0; // line power over the noise within its width

std::size_t segment_size(const audio_quality_meter::config& c) {
    const std::size_t wanted = fast_fft_size(static_cast<std::size_t>(0.5 * c.audio_rate_hz));
    const auto there = static_cast<std::size_t>(std::max<sample_index>(c.audio_samples, 64));
    return std::min(wanted, there) / 2 * 2;
}

/// Mean-square spectrum of the averaged segments, and the band in it.
struct line_spectrum {
    std::vector<double> power; // one-sided: the bins of a line add up to its mean square
    double bin_hz;
    std::size_t low, high; // bins of the band, both inside

    [[nodiscard]] std::size_t bin(double hz) const noexcept {
        return static_cast<std::size_t>(std::llround(hz / bin_hz));
    }
    /// Bins [first, last] of a line at `hz`, inside the spectrum.
    struct range {
        std::size_t first, last;
    };
    [[nodiscard]] range around(double hz, std::size_t half) const noexcept {
        const std::size_t centre = bin(hz);
        return {centre - std::min(centre, half), std::min(centre + half, power.size() - 1)};
    }
    [[nodiscard]] double sum(range r) const noexcept {
        return std::accumulate(power.begin() + static_cast<std::ptrdiff_t>(r.first),
                               power.begin() + static_cast<std::ptrdiff_t>(r.last + 1), 0.0);
    }
    /// Half the width of a line, in bins.
    [[nodiscard]] std::size_t half_width(double tone_hz) const noexcept {
        const auto wide = std::max<std::size_t>(5, bin(12.0));
        const auto room = static_cast<std::size_t>(0.45 * tone_hz / bin_hz);
        return std::max<std::size_t>(4, std::min(wide, room)); // 4: the window's own main lobe
    }
    /// Mean power of a bin that holds no line: those above 4 times the median are left out.
    [[nodiscard]] double floor() const {
        const std::vector<double> band{power.begin() + static_cast<std::ptrdiff_t>(low),
                                       power.begin() + static_cast<std::ptrdiff_t>(high + 1)};
        const double limit = 4.0 * median(band);
        double total = 0.0, count = 0.0;
        for (const double p : band) {
            if (p <= limit) {
                total += p;
                count += 1.0;
            }
        }
        return total / count;
    }
};

} // namespace

sheet describe(const audio_quality& q) {
    sheet out;
    out.add("frequency_hz", "Hz", q.frequency_hz);
    out.add("level_dbfs", "dBFS", q.level_dbfs);
    out.add("snr_db", "dB", q.snr_db);
    out.add("thd_percent", "%", q.thd_percent);
    return out;
}

audio_quality_meter::audio_quality_meter(const config& c)
    : config_{c}, window_{blackman_harris_window(segment_size(c))}, transform_{window_.size()},
      last_(window_.size() / 2 + 1), power_(last_.size()), turn_(last_.size()) {
    segment_.reserve(window_.size());
}

double audio_quality_meter::bin_hz() const noexcept {
    return config_.audio_rate_hz / static_cast<double>(window_.size());
}

void audio_quality_meter::add(std::span<const float> audio) {
    for (const float sample : audio) {
        take(sample);
    }
}

void audio_quality_meter::take(float sample) {
    silent_ = sample == 0.0F ? silent_ + 1 : 0;
    if (silent_ >= gap_samples) {
        segment_.clear();
        follows_ = false;
        return;
    }
    segment_.push_back(sample);
    if (segment_.size() == window_.size()) {
        add_segment();
        segment_.erase(segment_.begin(),
                       segment_.begin() + static_cast<std::ptrdiff_t>(window_.size() / 2));
    }
}

void audio_quality_meter::add_segment() {
    const auto in = transform_.input();
    for (std::size_t i = 0; i < segment_.size(); ++i) {
        in[i] = {static_cast<float>(window_.values()[i] * static_cast<double>(segment_[i])), 0.0F};
    }
    transform_.run();
    for (std::size_t k = 0; k < power_.size(); ++k) {
        const cf64 now{transform_.output()[k]}, before{last_[k]};
        power_[k] += std::norm(now);
        if (follows_) {
            turn_[k] += now * std::conj(before);
        }
        last_[k] = transform_.output()[k];
    }
    follows_ = true;
    ++segments_;
}

/// From the peak's shape, then from how far the line turns between two segments, half a segment
/// apart.
double audio_quality_meter::frequency_at(std::size_t peak) const {
    double bins = static_cast<double>(peak);
    if (peak > 0 && peak + 1 < power_.size()) {
        const double left = std::log(power_[peak - 1]), right = std::log(power_[peak + 1]);
        const double bend = left - 2.0 * std::log(power_[peak]) + right;
        bins += std::isfinite(bend) && bend < 0.0 ? 0.5 * (left - right) / bend : 0.0;
    }
    if (std::norm(turn_[peak]) > 0.0) {
        const double turns = std::arg(turn_[peak]) / (2.0 * std::numbers::pi);
        bins = 2.0 * (turns + std::round(0.5 * bins - turns));
    }
    return bins * bin_hz();
}

audio_quality audio_quality_meter::result() const {
    audio_quality q;
    const auto top = static_cast<std::size_t>(config_.high_hz / bin_hz());
    const auto bottom = static_cast<std::size_t>(std::ceil(config_.low_hz / bin_hz()));
    if (segments_ == 0 || top >= power_.size() || top < bottom + 16) {
        return q;
    }
    line_spectrum s{power_, bin_hz(), bottom, top};
    double window_power = 0.0;
    for (const double w : window_.values()) {
        window_power += w * w;
    }
    const double scale =
        2.0 / (static_cast<double>(window_.size()) * window_power * static_cast<double>(segments_));
    for (double& p : s.power) {
        p *= scale;
    }

    std::size_t from = bottom, until = top;
    if (std::isfinite(config_.tone_hz)) {
        const double slack_hz = std::max({2.0, 0.02 * config_.tone_hz, 2.0 * bin_hz()});
        from = std::clamp(s.bin(std::max(0.0, config_.tone_hz - slack_hz)), bottom, top);
        until = std::clamp(s.bin(config_.tone_hz + slack_hz), bottom, top);
    }
    const auto at = [&](std::size_t k) { return s.power.begin() + static_cast<std::ptrdiff_t>(k); };
    const auto peak =
        static_cast<std::size_t>(std::max_element(at(from), at(until + 1)) - s.power.begin());
    const double tone_hz = frequency_at(peak);
    const std::size_t half = s.half_width(tone_hz);
    const double line_floor = s.floor() * static_cast<double>(2 * half + 1);
    const double tone_power = s.sum(s.around(tone_hz, half)) - line_floor;
    if (!(tone_power > detection_ratio * line_floor)) {
        return q;
    }

    double harmonic_power = 0.0;
    bool any = false;
    std::vector<bool> noise(s.power.size(), true);
    for (unsigned order = 1; order <= last_harmonic && order * tone_hz <= config_.high_hz;
         ++order) {
        const auto line = s.around(order * tone_hz, half);
        std::fill(noise.begin() + static_cast<std::ptrdiff_t>(line.first),
                  noise.begin() + static_cast<std::ptrdiff_t>(line.last + 1), false);
        if (order > 1) {
            harmonic_power += s.sum(line) - line_floor;
            any = true;
        }
    }
    double noise_sum = 0.0, noise_bins = 0.0;
    for (std::size_t k = bottom; k <= top; ++k) {
        if (noise[k]) {
            noise_sum += s.power[k];
            noise_bins += 1.0;
        }
    }
    q.frequency_hz = tone_hz;
    q.level_dbfs = decibel::from_power_ratio(2.0 * tone_power).db();
    const double noise_power = noise_sum / noise_bins * static_cast<double>(top - bottom + 1);
    q.snr_db = decibel::from_power_ratio(tone_power / noise_power).db();
    q.thd_percent =
        any ? 100.0 * std::sqrt(std::max(0.0, harmonic_power) / tone_power) : not_measured;
    return q;
}

} // namespace tonewalk
