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

/// Bins [first, last].
struct bin_range {
    std::size_t first = 0, last = 0;
};

/// Mean-square spectrum of the averaged segments, one-sided: the bins of a line add up to its mean
/// square.
struct line_spectrum {
    std::vector<double> power;
    double bin_hz = 0.0;
    bin_range band;

    [[nodiscard]] std::size_t bin(double hz) const noexcept {
        return static_cast<std::size_t>(std::llround(std::max(0.0, hz) / bin_hz));
    }
    [[nodiscard]] bin_range around(double hz, std::size_t half) const noexcept {
        const std::size_t centre = bin(hz);
        return {centre - std::min(centre, half), std::min(centre + half, power.size() - 1)};
    }
    [[nodiscard]] std::span<const double> bins(bin_range r) const noexcept {
        return std::span{power}.subspan(r.first, r.last + 1 - r.first);
    }
    [[nodiscard]] double sum(bin_range r) const noexcept {
        const auto part = bins(r);
        return std::accumulate(part.begin(), part.end(), 0.0);
    }
};

/// Half the width of a tone's lines, in bins.
std::size_t half_width(const line_spectrum& s, double tone_hz) noexcept {
    constexpr std::size_t main_lobe = 4; // of the window, to either side
    const std::size_t wide = std::max(main_lobe + 1, s.bin(12.0));
    const auto room = static_cast<std::size_t>(0.45 * tone_hz / s.bin_hz);
    return std::max(main_lobe, std::min(wide, room));
}

/// Mean power of a bin in the band that holds no line: those above 4 times the median are left out.
double floor_of(const line_spectrum& s) {
    const auto band = s.bins(s.band);
    const double limit = 4.0 * median({band.begin(), band.end()});
    double total = 0.0, count = 0.0;
    for (const double p : band) {
        if (p <= limit) {
            total += p;
            count += 1.0;
        }
    }
    return total / count;
}

/// The highest bin in the band, near `tone_hz` where that is known.
std::size_t highest_bin(const line_spectrum& s, double tone_hz) noexcept {
    bin_range where = s.band;
    if (std::isfinite(tone_hz)) {
        const double slack_hz = std::max({2.0, 0.02 * tone_hz, 2.0 * s.bin_hz});
        where.first = std::clamp(s.bin(tone_hz - slack_hz), s.band.first, s.band.last);
        where.last = std::clamp(s.bin(tone_hz + slack_hz), s.band.first, s.band.last);
    }
    const auto part = s.bins(where);
    const auto highest = std::max_element(part.begin(), part.end()) - part.begin();
    return where.first + static_cast<std::size_t>(highest);
}

/// Power of all in the band but the tone and its harmonics, as if it went on beneath them.
double noise_power(const line_spectrum& s, double tone_hz, std::size_t half) {
    std::vector<bool> line(s.power.size());
    for (unsigned order = 1; order <= last_harmonic; ++order) {
        if (s.bin(order * tone_hz) < line.size()) {
            const bin_range r = s.around(order * tone_hz, half);
            std::fill_n(line.begin() + static_cast<std::ptrdiff_t>(r.first), r.last + 1 - r.first,
                        true);
        }
    }
    double total = 0.0, count = 0.0;
    for (std::size_t k = s.band.first; k <= s.band.last; ++k) {
        total += line[k] ? 0.0 : s.power[k];
        count += line[k] ? 0.0 : 1.0;
    }
    return total / count * static_cast<double>(s.band.last + 1 - s.band.first);
}

// In power: below 1 % distortion is told to be small even where the noise is larger.
constexpr double least_told_distortion = 1e-4;

/// Level, noise and distortion of the tone at `tone_hz`; nothing where it does not stand out.
audio_quality quality_of(const line_spectrum& s, double tone_hz, double high_hz) {
    const std::size_t half = half_width(s, tone_hz);
    const double floor = floor_of(s) * static_cast<double>(2 * half + 1);
    const double tone_power = s.sum(s.around(tone_hz, half)) - floor;
    audio_quality q;
    if (!(tone_power > detection_ratio * floor)) {
        return q;
    }
    q.frequency_hz = tone_hz;
    q.level_dbfs = decibel::from_power_ratio(2.0 * tone_power).db();
    q.snr_db = decibel::from_power_ratio(tone_power / noise_power(s, tone_hz, half)).db();
    if (2.0 * tone_hz <= high_hz) {
        double harmonics = 0.0, under_them = 0.0;
        for (unsigned order = 2; order <= last_harmonic && order * tone_hz <= high_hz; ++order) {
            harmonics += s.sum(s.around(order * tone_hz, half)) - floor;
            under_them += floor;
        }
        const bool lost_in_noise =
            harmonics < under_them && under_them > least_told_distortion * tone_power;
        q.thd_percent =
            lost_in_noise ? not_measured : 100.0 * std::sqrt(std::max(0.0, harmonics) / tone_power);
    }
    return q;
}

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
    const auto first = static_cast<std::size_t>(std::ceil(config_.low_hz / bin_hz()));
    const auto last = static_cast<std::size_t>(config_.high_hz / bin_hz());
    constexpr std::size_t fewest_bins = 16; // fewer show no line beside its noise
    if (segments_ == 0 || last >= power_.size() || last < first + fewest_bins) {
        return {};
    }
    double window_power = 0.0;
    for (const double w : window_.values()) {
        window_power += w * w;
    }
    line_spectrum s{power_, bin_hz(), {first, last}};
    const double squares = static_cast<double>(window_.size() * segments_) * window_power;
    for (double& p : s.power) {
        p *= 2.0 / squares;
    }
    return quality_of(s, frequency_at(highest_bin(s, config_.tone_hz)), config_.high_hz);
}

} // namespace tonewalk
