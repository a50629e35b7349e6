// SPDX-License-Identifier: GPL-3.0-or-later
#include "noise_lines.hpp"

#include <algorithm>
#include <cmath>
#include <numbers>
#include <utility>

#include "tonewalk/base/random.hpp"

namespace tonewalk {
namespace {

using std::numbers::pi;
constexpr double line_guard_bins = 4.0; // half the main lobe of the window
constexpr double mains_guard_bins = 1.0;
constexpr double mains_highest_hz = 1000.0;
constexpr double mains_least_window_s = 0.0999;
constexpr double outlier_ratio = 4.0; // times the median
constexpr std::size_t correlated_bins = 4;

/// Mean of an exponential distribution cut at `outlier_ratio` medians, over its whole mean.
double mean_after_cut() {
    const double cut = outlier_ratio * std::numbers::ln2;
    const double rest = std::exp(-cut);
    return 1.0 - cut * rest / (1.0 - rest);
}

struct kept_lines {
    double sum = 0.0, count = 0.0, limit = 0.0;
};

kept_lines without_outliers(const std::vector<double>& powers, std::vector<double>& sorted) {
    sorted = powers;
    const auto middle = sorted.begin() + static_cast<std::ptrdiff_t>(sorted.size() / 2);
    std::nth_element(sorted.begin(), middle, sorted.end());
    const double below = sorted.size() % 2 == 1 || sorted.size() < 2
                             ? *middle
                             : *std::max_element(sorted.begin(), middle);
    kept_lines kept{0.0, 0.0, outlier_ratio * 0.5 * (below + *middle)};
    for (const double power : powers) {
        if (power <= kept.limit) {
            kept.sum += power;
            kept.count += 1.0;
        }
    }
    return kept;
}

/// The largest length of small prime factors that fits: a little of the record's end may be left
/// out.
std::size_t fitting_size(std::size_t samples) {
    std::size_t size = samples;
    while (size > 1 && fast_fft_size(size) != size) {
        --size;
    }
    return size;
}

void take_out(sample_runs::run& from, const run_phasor& line) noexcept {
    const double re = line.now().real(), im = line.now().imag();
    const sample_runs::run& table = line.table();
    for (std::size_t k = 0; k < run_samples; ++k) {
        from.re[k] -= re * table.re[k] - im * table.im[k];
        from.im[k] -= re * table.im[k] + im * table.re[k];
    }
}

double distance_to_multiple(double hz, double of_hz) {
    const double nearest = std::round(hz / of_hz);
    return nearest == 0.0 ? hz : std::abs(hz - nearest * of_hz);
}

} // namespace

noise_lines::noise_lines(const config& c)
    : rate_hz_{c.rate_hz}, width_hz_{c.width_hz}, record_samples_{c.record_samples},
      fft_{fitting_size(c.record_samples)}, window_{blackman_harris_window(fft_.size())},
      powers_(fft_.size()) {
    const auto size = static_cast<double>(fft_.size());
    bin_hz_ = rate_hz_ / size;
    double squares = 0.0;
    for (const double w : window_.values()) {
        squares += w * w;
    }
    constexpr double hann_noise_bins = 1.5;
    scale_.assign(fft_.size(), hann_noise_bins / static_cast<double>(record_samples_) / squares);
    for (std::size_t k = 0; k < fft_.size(); ++k) {
        const double hz = bin_hz_ * (k < (fft_.size() + 1) / 2 ? static_cast<double>(k)
                                                               : static_cast<double>(k) - size);
        if (std::abs(hz) <= width_hz_ / 2.0 && c.response) {
            const double gain = c.response(hz);
            scale_[k] /= gain * gain;
        }
    }
    for (std::size_t k = 0; k <= correlated_bins; ++k) {
        correlation_.push_back(window_.power_correlation(static_cast<double>(k)));
    }
}

bool noise_lines::is_usable(double hz, std::span<const fitted_line> lines) const noexcept {
    if (std::abs(hz) > width_hz_ / 2.0) {
        return false;
    }
    for (const fitted_line& line : lines) {
        if (std::abs(hz - line.hz) < line_guard_bins * bin_hz_) {
            return false;
        }
    }
    const double from_carrier = std::abs(hz - lines.front().hz);
    const double window_s = static_cast<double>(record_samples_) / rate_hz_;
    if (window_s >= mains_least_window_s &&
        from_carrier <= mains_highest_hz + mains_guard_bins * bin_hz_) {
        for (const double mains_hz : {50.0, 60.0}) {
            if (distance_to_multiple(from_carrier, mains_hz) < mains_guard_bins * bin_hz_) {
                return false;
            }
        }
    }
    return true;
}

std::size_t noise_lines::usable(std::span<const fitted_line> lines) const {
    const auto reach = static_cast<int>(width_hz_ / 2.0 / bin_hz_);
    std::size_t count = 0;
    for (int k = -reach; k <= reach; ++k) {
        count += is_usable(k * bin_hz_, lines) ? 1U : 0U;
    }
    return count;
}

noise_lines::spectral_line noise_lines::strongest_near(double hz, double reach_hz) const noexcept {
    spectral_line best;
    const auto size = static_cast<int>(powers_.size());
    const auto first = static_cast<int>(std::ceil((hz - reach_hz) / bin_hz_));
    const auto last = static_cast<int>(std::floor((hz + reach_hz) / bin_hz_));
    for (int k = std::max(first, -(size - 1) / 2); k <= std::min(last, (size - 1) / 2); ++k) {
        const double power =
            static_cast<double>(powers_[static_cast<std::size_t>(k < 0 ? k + size : k)]);
        if (power > best.power) {
            best = {k * bin_hz_, power};
        }
    }
    return best;
}

void noise_lines::transform(const sample_runs& record, std::span<const fitted_line> lines) {
    const double centre = static_cast<double>(record_samples_) / 2.0;
    running_.clear();
    for (const fitted_line& line : lines) {
        const double turns = line.hz / rate_hz_;
        running_.emplace_back(turns, line.amplitude * std::polar(1.0, -2.0 * pi * turns * centre));
    }
    const std::span<cf32> in = fft_.input();
    const std::span<const double> weights = window_.values();
    for (std::size_t first = 0; first < in.size(); first += run_samples) {
        sample_runs::run rest = record.runs()[first / run_samples];
        for (run_phasor& line : running_) {
            take_out(rest, line);
            line.next_run();
        }
        const std::size_t count = std::min(run_samples, in.size() - first);
        for (std::size_t k = 0; k < count; ++k) {
            in[first + k] = {static_cast<float>(rest.re[k] * weights[first + k]),
                             static_cast<float>(rest.im[k] * weights[first + k])};
        }
    }
    fft_.run();
    const std::span<const cf32> out = fft_.output();
    for (std::size_t k = 0; k < out.size(); ++k) {
        const double re = static_cast<double>(out[k].real()),
                     im = static_cast<double>(out[k].imag());
        powers_[k] = static_cast<float>((re * re + im * im) * scale_[k]);
    }
}

noise_reading noise_lines::average() {
    constexpr std::size_t few = 32;
    const kept_lines kept = without_outliers(kept_, sorted_);
    const double mean = kept.sum / kept.count;
    if (kept_.size() < few) {
        const small_sample& s = small_sample_for(chosen_);
        return {mean / s.bias, s.independent};
    }
    double shared = 0.0;
    for (std::size_t a = 0; a < kept_.size(); ++a) {
        if (kept_[a] > kept.limit) {
            continue;
        }
        shared += 1.0;
        for (std::size_t b = a + 1; b < kept_.size(); ++b) {
            const auto apart = static_cast<std::size_t>(chosen_[b] - chosen_[a]);
            if (apart > correlated_bins) {
                break;
            }
            shared += 2.0 * correlation_[apart];
        }
    }
    static const double bias = mean_after_cut();
    return {mean / bias, kept.count * kept.count / shared};
}

/// Few lines, neighbours alike: what the outlier rule does to them is found by trying it on noise
/// that the window colours as it colours the recording's.
const noise_lines::small_sample& noise_lines::small_sample_for(const std::vector<int>& bins) {
    const auto found = small_samples_.find(bins);
    if (found != small_samples_.end()) {
        return found->second;
    }
    // The window's own transform: what each line takes from its neighbours of white noise.
    constexpr int reach = 3;
    constexpr double takes[] = {0.35875, -0.48829 / 2, 0.14128 / 2, -0.01168 / 2};
    double squares = takes[0] * takes[0];
    for (int k = 1; k <= reach; ++k) {
        squares += 2.0 * takes[k] * takes[k];
    }
    constexpr int trials = 1000;
    random_stream random{1};
    const int first = bins.front() - reach;
    std::vector<cf64> white(static_cast<std::size_t>(bins.back() + reach - first + 1));
    std::vector<double> powers(bins.size());
    double sum = 0.0, sum_of_squares = 0.0;
    for (int trial = 0; trial < trials; ++trial) {
        for (cf64& w : white) {
            const double re = random.gaussian(), im = random.gaussian();
            w = {re, im};
        }
        for (std::size_t k = 0; k < bins.size(); ++k) {
            cf64 line{};
            for (int m = -reach; m <= reach; ++m) {
                line += takes[std::abs(m)] * white[static_cast<std::size_t>(bins[k] + m - first)];
            }
            powers[k] = std::norm(line) / (2.0 * squares);
        }
        const kept_lines kept = without_outliers(powers, sorted_);
        sum += kept.sum / kept.count;
        sum_of_squares += kept.sum / kept.count * (kept.sum / kept.count);
    }
    const double mean = sum / trials;
    const double variance = sum_of_squares / trials - mean * mean;
    const small_sample made{mean, mean * mean / variance};
    return small_samples_.emplace(bins, made).first->second;
}

noise_reading noise_lines::measure(const sample_runs& record, std::span<const fitted_line> lines) {
    transform(record, lines);
    chosen_.clear();
    kept_.clear();
    const auto size = static_cast<int>(powers_.size());
    const auto reach = std::min(static_cast<int>(width_hz_ / 2.0 / bin_hz_), (size - 1) / 2);
    for (int k = -reach; k <= reach; ++k) {
        if (is_usable(k * bin_hz_, lines)) {
            chosen_.push_back(k);
            kept_.push_back(
                static_cast<double>(powers_[static_cast<std::size_t>(k < 0 ? k + size : k)]));
        }
    }
    return kept_.empty() ? noise_reading{} : average();
}

} // namespace tonewalk
