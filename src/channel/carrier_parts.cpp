// SPDX-License-Identifier: GPL-3.0-or-later
#include "carrier_parts.hpp"

#include <algorithm>
#include <cmath>
#include <complex>
#include <numbers>

#include "tonewalk/maths/fft.hpp"
#include "tonewalk/maths/window.hpp"

namespace tonewalk {
namespace {

constexpr double two_pi = 2.0 * std::numbers::pi;
constexpr double steady_s = 0.875;    // parts that lie wholly inside 1 s
constexpr double least_share = 0.5;   // of the mean depth: silence is steady too
constexpr double most_unrest = 0.1;   // of the tone's power, in any part
constexpr double noise_allowed = 6.0; // times the mean noise power: one part in 400 exceeds it
constexpr double hann_noise_bins = 1.5;
constexpr double least_rms_depth = 0.005; // below, it is nobody's speech
constexpr double in_step_bins = 3.0;      // in-step power of depth 1 rms: twice 1.5 bins
constexpr double in_step_ratio = 1.5;     // noise alone: 1 within some hundredths

/// e^(j 2 pi turns n), n from 0.
class turning {
public:
    explicit turning(double turns) : each_{std::polar(1.0, two_pi * turns)} {}
    [[nodiscard]] double cosine() const noexcept { return re_; }
    [[nodiscard]] double sine() const noexcept { return im_; }
    void step() noexcept {
        const double re = re_ * each_.real() - im_ * each_.imag();
        im_ = re_ * each_.imag() + im_ * each_.real();
        re_ = re;
    }

private:
    cf64 each_;
    double re_ = 1.0, im_ = 0.0;
};

} // namespace

carrier_parts::carrier_parts(std::span<const cf32> samples, double rate_hz, double carrier_hz,
                             double part_s)
    : rate_hz_{rate_hz} {
    const auto wanted = static_cast<std::size_t>(part_s * rate_hz);
    size_ = std::max<std::size_t>(1, std::min(wanted, samples.size() / 2));
    count_ = samples.size() / size_;
    windowed_.resize(count_ * size_);
    const window shape = hann_window(size_);
    turning back{-carrier_hz / rate_hz};
    for (std::size_t k = 0; k < count_; ++k) {
        double sum_re = 0.0, sum_im = 0.0;
        for (std::size_t n = 0; n < size_; ++n, back.step()) {
            const cf32 z = samples[k * size_ + n];
            const double weight = 2.0 * shape.values()[n];
            const double cosine = weight * back.cosine(), sine = weight * back.sine();
            const double in_re = static_cast<double>(z.real()),
                         in_im = static_cast<double>(z.imag());
            const double re = in_re * cosine - in_im * sine, im = in_re * sine + in_im * cosine;
            sum_re += re;
            sum_im += im;
            windowed_[k * size_ + n] = {static_cast<float>(re), static_cast<float>(im)};
        }
        carrier_.emplace_back(sum_re, sum_im);
    }
}

std::span<const cf32> carrier_parts::part(std::size_t k) const noexcept {
    return std::span{windowed_}.subspan(k * size_, size_);
}

std::vector<carrier_parts::sidebands> carrier_parts::sidebands_at(double tone_hz) const {
    const double turns = tone_hz / rate_hz_;
    std::vector<float> cosine(size_), sine(size_);
    turning along{turns};
    for (std::size_t n = 0; n < size_; ++n, along.step()) {
        cosine[n] = static_cast<float>(along.cosine());
        sine[n] = static_cast<float>(along.sine());
    }
    std::vector<sidebands> found;
    for (std::size_t k = 0; k < count_; ++k) {
        const std::span<const cf32> z = part(k);
        double re_cos = 0.0, re_sin = 0.0, im_cos = 0.0, im_sin = 0.0;
        for (std::size_t n = 0; n < size_; ++n) {
            re_cos += static_cast<double>(z[n].real() * cosine[n]);
            re_sin += static_cast<double>(z[n].real() * sine[n]);
            im_cos += static_cast<double>(z[n].imag() * cosine[n]);
            im_sin += static_cast<double>(z[n].imag() * sine[n]);
        }
        const cf64 back =
            std::polar(1.0, -two_pi * std::fmod(turns * static_cast<double>(k * size_), 1.0));
        const cf64 upper = cf64{re_cos + im_sin, im_cos - re_sin} * back;
        const cf64 lower = cf64{re_cos - im_sin, im_cos + re_sin} * std::conj(back);
        const cf64 up = upper * std::conj(carrier_[k]), low = std::conj(lower) * carrier_[k];
        found.push_back({up + low, up - low});
    }
    return found;
}

/// Fades part a line into what came before and after, whose sum peaks beside the true frequency.
double carrier_parts::straighten(std::span<sidebands> tone) const {
    cf64 turn{};
    for (std::size_t k = 1; k < count_; ++k) {
        turn += tone[k].in_step * std::conj(tone[k - 1].in_step);
    }
    const double most_turns = 1.0 / static_cast<double>(count_);
    const double turns = std::clamp(std::arg(turn) / two_pi, -most_turns, most_turns);
    for (std::size_t k = 0; k < count_; ++k) {
        tone[k].in_step *= std::polar(1.0, -two_pi * turns * static_cast<double>(k));
    }
    return turns;
}

std::optional<double> carrier_parts::steady_tone(double tone_hz, double depth,
                                                 double noise_density) const {
    std::vector<sidebands> tone = sidebands_at(tone_hz);
    double quadrature = 0.0, carrier_power = 0.0;
    for (std::size_t k = 0; k < count_; ++k) {
        quadrature += std::norm(tone[k].quadrature);
        carrier_power += std::norm(carrier_[k]);
    }
    // Noise of a sideband pair over the carrier's power; modulation that is no tone raises the
    // density beside the line, but nothing in quadrature.
    const double size = static_cast<double>(size_);
    const double noise = std::min(quadrature / carrier_power,
                                  2.0 * noise_density * hann_noise_bins * rate_hz_ * size);
    if (agree(tone, depth, noise)) {
        return tone_hz;
    }
    const double turns_a_part = straighten(tone);
    return agree(tone, depth, noise) ? std::optional{tone_hz + turns_a_part * rate_hz_ / size}
                                     : std::nullopt;
}

bool carrier_parts::agree(std::span<const sidebands> tone, double depth, double noise) const {
    const double part_s = static_cast<double>(size_) / rate_hz_;
    const std::size_t run = std::clamp<std::size_t>(
        static_cast<std::size_t>(std::lround(steady_s / part_s)), 2, count_);
    for (std::size_t first = 0; first + run <= count_; ++first) {
        cf64 sum{};
        double power = 0.0;
        for (std::size_t k = first; k < first + run; ++k) {
            sum += tone[k].in_step;
            power += std::norm(carrier_[k]);
        }
        const cf64 mean = sum / power;
        bool still = std::abs(mean) > least_share * depth;
        for (std::size_t k = first; k < first + run; ++k) {
            const double here = std::norm(carrier_[k]);
            const double unrest = std::norm(tone[k].in_step / here - mean);
            still = still && unrest <= most_unrest * std::norm(mean) + noise_allowed * noise / here;
        }
        if (still) {
            return true;
        }
    }
    return false;
}

bool carrier_parts::in_step(double low_hz, double high_hz,
                            std::span<const found_tone> tones) const {
    constexpr double tone_bins = 2.5; // half of a Hann line's foot
    const double bin_hz = rate_hz_ / static_cast<double>(size_);
    const auto bin = [&](double hz) {
        return static_cast<std::size_t>(std::max(1.0, hz / bin_hz));
    };
    fft transform{size_};
    double in_step = 0.0, quadrature = 0.0, carrier_squares = 0.0;
    for (std::size_t k = 0; k < count_; ++k) {
        std::copy_n(part(k).begin(), size_, transform.input().begin());
        transform.run();
        carrier_squares += std::norm(carrier_[k]) * std::norm(carrier_[k]);
        const std::span<const cf32> lines = transform.output();
        for (std::size_t b = bin(low_hz); b < std::min(bin(high_hz), size_ / 2); ++b) {
            const double hz = static_cast<double>(b) * bin_hz;
            const bool is_tone =
                std::any_of(tones.begin(), tones.end(), [&](const found_tone& tone) {
                    return std::abs(tone.frequency_hz - hz) < tone_bins * bin_hz;
                });
            if (!is_tone) {
                const cf64 up = cf64{lines[b]} * std::conj(carrier_[k]);
                const cf64 low = std::conj(cf64{lines[size_ - b]}) * carrier_[k];
                in_step += std::norm(up + low);
                quadrature += std::norm(up - low);
            }
        }
    }
    const double least = in_step_bins * least_rms_depth * least_rms_depth * carrier_squares;
    return in_step > std::max(least, in_step_ratio * quadrature);
}

} // namespace tonewalk
