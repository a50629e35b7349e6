// SPDX-License-Identifier: GPL-3.0-or-later
#include "close_look.hpp"

#include <algorithm>
#include <cmath>
#include <numbers>

#include "decimator.hpp"
#include "tonewalk/base/decibel.hpp"
#include "tonewalk/base/random.hpp"
#include "tonewalk/maths/fft.hpp"
#include "tonewalk/maths/fir.hpp"

namespace tonewalk {
namespace {

constexpr double look_rate_hz = 32e3; // at least, where the recording has it
constexpr double look_half_hz = 13e3; // flat; tones reach 12 kHz
constexpr double lowest_tone_hz = 20.0, highest_tone_hz = 12e3;
const double line_ratio = decibel::from_db(12.0).power_ratio();
const double strongest_sideband =
    decibel::from_db(-2.5).power_ratio(); // of the carrier: 150 % depth
const double most_imbalance = decibel::from_db(12.0).power_ratio();
constexpr double weak_hum_depth = 0.05;
constexpr double alike = 0.794;                        // 1 dB in power
constexpr std::size_t parts = 8, parts_for_steady = 4; // 1 s of 2 s
constexpr double steady_share = 0.75;
constexpr std::size_t convert_run = 16384;

double nearest_multiple_distance(double hz, double of_hz) {
    return std::abs(hz - std::round(hz / of_hz) * of_hz);
}

bool is_mains_multiple(double hz) {
    constexpr double tolerance_hz = 0.6;
    return nearest_multiple_distance(hz, 50.0) < tolerance_hz ||
           nearest_multiple_distance(hz, 60.0) < tolerance_hz;
}

/// Steps of at most 64, all together `total` at most.
std::vector<std::size_t> decimation_steps(std::size_t total) {
    std::vector<std::size_t> steps;
    while (total > 1) {
        const std::size_t step = total > 64 ? 32 : total;
        steps.push_back(step);
        total /= step;
    }
    return steps;
}

std::size_t transform_size(std::size_t samples) {
    std::size_t size = samples;
    while (size > 1 && fast_fft_size(size) != size) {
        --size;
    }
    return size;
}

} // namespace

close_look::close_look(const looked_at& what, double offset_hz)
    : offset_hz_{offset_hz}, band_low_hz_{what.facts->format.is_complex
                                              ? -what.facts->sample_rate_hz / 2.0
                                              : 0.0},
      band_high_hz_{what.facts->sample_rate_hz / 2.0} {
    const double input_rate_hz = what.facts->sample_rate_hz;
    std::vector<decimator> filters;
    double rate = input_rate_hz;
    for (const std::size_t step :
         decimation_steps(static_cast<std::size_t>(std::max(1.0, input_rate_hz / look_rate_hz)))) {
        const double next = rate / static_cast<double>(step);
        filters.emplace_back(design_low_pass({.rate_hz = rate,
                                              .pass_edge_hz = look_half_hz,
                                              .stop_edge_hz = next - look_half_hz,
                                              .attenuation_db = 90.0}),
                             rate, step);
        filters.back().begin(0);
        rate = next;
    }
    rate_hz_ = rate;
    const std::uint64_t step = phase_step(offset_hz, input_rate_hz);
    const std::size_t frame_bytes = what.facts->frame_bytes();
    std::vector<cf32> run(convert_run), next;
    for (std::size_t first = 0; first < what.frames; first += convert_run) {
        const std::size_t count = std::min(convert_run, what.frames - first);
        run.resize(count);
        what.converter->convert(what.bytes.subspan(first * frame_bytes, count * frame_bytes), run);
        const exact_sine_cosine start = exact_turn(step * first), by = exact_turn(step);
        cf64 turn{start.cosine, -start.sine};
        const cf64 each{by.cosine, -by.sine};
        for (cf32& z : run) {
            const cf64 moved = cf64{z} * turn;
            z = cf32{moved};
            turn *= each;
        }
        for (decimator& filter : filters) {
            next.clear();
            filter.add(run, next);
            run.swap(next);
        }
        samples_.insert(samples_.end(), run.begin(), run.end());
    }
    spectrum_.emplace(transform_size(samples_.size()), rate_hz_);
    spectrum_->add(std::span<const cf32>{samples_}.first(spectrum_->size()));
    spectrum_->finish();
}

bool close_look::in_band(double hz) const noexcept {
    const double absolute = offset_hz_ + hz;
    return absolute > band_low_hz_ && absolute < band_high_hz_ &&
           std::abs(hz) < std::min(rate_hz_ / 2.0, look_half_hz);
}

std::optional<double> close_look::strongest(double reach_hz) const {
    const std::size_t low = spectrum_->bin_of(-reach_hz), high = spectrum_->bin_of(reach_hz);
    std::optional<std::size_t> best;
    for (std::size_t k = low; k <= high; ++k) {
        if (spectrum_->is_line(k, line_ratio) &&
            (!best || spectrum_->power(k) > spectrum_->power(*best))) {
            best = k;
        }
    }
    return best ? std::optional<double>{spectrum_->peak_hz(*best)} : std::nullopt;
}

/// Mean of the Hann-windowed product with a line at `hz`.
cf64 close_look::correlate(double hz, std::size_t first, std::size_t count) const {
    const double step = -2.0 * std::numbers::pi * hz / rate_hz_;
    cf64 turn = std::polar(1.0, step * static_cast<double>(first));
    const cf64 each = std::polar(1.0, step);
    cf64 sum{};
    const double hann_step = 2.0 * std::numbers::pi / static_cast<double>(count);
    cf64 hann{1.0, 0.0};
    const cf64 hann_each = std::polar(1.0, hann_step);
    for (std::size_t n = 0; n < count; ++n) {
        sum += (1.0 - hann.real()) * cf64{samples_[first + n]} * turn;
        turn *= each;
        hann *= hann_each;
    }
    return sum / static_cast<double>(count);
}

double close_look::power_at(double hz) const {
    return std::norm(correlate(hz, 0, samples_.size()));
}

/// Lines that mirror each other about the carrier, both 12 dB over the noise.
std::vector<close_look::pair> close_look::pairs(double carrier_hz, double low_hz,
                                                double high_hz) const {
    std::vector<pair> found;
    const double carrier_power = power_at(carrier_hz);
    const double bin_hz = spectrum_->bin_hz();
    const double least_hz = std::max(low_hz, 5.0 * bin_hz); // outside the carrier's own main lobe
    for (std::size_t k = spectrum_->bin_of(carrier_hz + least_hz); k + 1 < spectrum_->size(); ++k) {
        if (!spectrum_->is_line(k, line_ratio)) {
            continue;
        }
        const double upper_hz = spectrum_->peak_hz(k), tone_hz = upper_hz - carrier_hz;
        if (tone_hz > high_hz || !in_band(upper_hz)) {
            break;
        }
        const double lower_hz = carrier_hz - tone_hz;
        if (tone_hz < least_hz || !in_band(lower_hz)) {
            continue;
        }
        const std::size_t mirror = spectrum_->bin_of(lower_hz);
        for (std::size_t m = mirror > 2 ? mirror - 2 : 0;
             m <= std::min(mirror + 2, spectrum_->size() - 1); ++m) {
            if (!spectrum_->is_line(m, line_ratio)) {
                continue;
            }
            const double up = spectrum_->power(k), down = spectrum_->power(m);
            const double weaker = std::min(up, down), stronger = std::max(up, down);
            if (stronger < strongest_sideband * carrier_power &&
                stronger < most_imbalance * weaker) {
                const double mean_hz = 0.5 * (upper_hz - spectrum_->peak_hz(m));
                found.push_back({mean_hz, weaker, up + down});
            }
        }
    }
    return found;
}

/// The tone against the carrier in eight parts: at least half of them in a row agree in amplitude
/// and phase.
bool close_look::steady(double carrier_hz, const pair& p) const {
    const std::size_t part = samples_.size() / parts;
    std::vector<cf64> tone(parts);
    double noise = 0.0;
    for (std::size_t k = 0; k < parts; ++k) {
        const cf64 c = correlate(carrier_hz, k * part, part);
        const cf64 u = correlate(carrier_hz + p.hz, k * part, part),
                   l = correlate(carrier_hz - p.hz, k * part, part);
        const double carrier = std::max(std::abs(c), 1e-30);
        tone[k] = (u * std::conj(c) + std::conj(l) * c) / (carrier * carrier);
    }
    const std::size_t bin = spectrum_->bin_of(carrier_hz + p.hz);
    const double part_noise = spectrum_->noise(bin) * static_cast<double>(parts) * 1.5 / 2.0;
    noise = 2.0 * part_noise / std::max(power_at(carrier_hz), 1e-60);
    for (std::size_t first = 0; first + parts_for_steady <= parts; ++first) {
        cf64 sum{};
        double total = 0.0;
        for (std::size_t k = first; k < first + parts_for_steady; ++k) {
            sum += tone[k];
            total += std::norm(tone[k]);
        }
        const double n = static_cast<double>(parts_for_steady);
        const double coherent = std::norm(sum / n),
                     all = std::max(total / n - noise, coherent * 0.5);
        if (coherent > steady_share * all && coherent > noise / n) {
            return true;
        }
    }
    return false;
}

found_carrier close_look::describe(double hz, std::optional<double> wanted_tone_hz) const {
    found_carrier c;
    c.offset_hz = offset_hz_ + hz;
    const double power = power_at(hz);
    const double density =
        spectrum_->noise(spectrum_->bin_of(hz)) / spectrum_->noise_bandwidth_hz();
    c.level_dbfs = decibel::from_power_ratio(power).db();
    c.carrier_to_noise_density_dbhz = decibel::from_power_ratio(power / density).db();
    const double reach_hz = wanted_tone_hz ? std::max(2.0, 0.02 * *wanted_tone_hz) : 0.0;
    const double low_hz = wanted_tone_hz ? *wanted_tone_hz - reach_hz : lowest_tone_hz;
    const double high_hz = wanted_tone_hz ? *wanted_tone_hz + reach_hz : highest_tone_hz;
    std::vector<pair> found = pairs(hz, low_hz, high_hz);
    const bool any = !found.empty();
    std::sort(found.begin(), found.end(),
              [](const pair& a, const pair& b) { return a.weaker > b.weaker; });
    constexpr std::size_t most_looked_at = 24;
    found.resize(std::min(found.size(), most_looked_at));
    if (!wanted_tone_hz) {
        found.erase(std::remove_if(found.begin(), found.end(),
                                   [&](const pair& p) { return !steady(hz, p); }),
                    found.end());
    }
    const auto depth = [power](const pair& p) { return std::sqrt(2.0 * p.power / power); };
    const auto is_hum = [&](const pair& p) {
        return is_mains_multiple(p.hz) && depth(p) < weak_hum_depth;
    };
    std::stable_sort(found.begin(), found.end(),
                     [&](const pair& a, const pair& b) { return !is_hum(a) && is_hum(b); });
    if (found.size() > 1) { // within 1 dB of the best, the lowest frequency
        const pair best = found.front();
        auto lowest = found.begin();
        for (auto p = found.begin(); p != found.end() && is_hum(*p) == is_hum(best); ++p) {
            lowest = p->weaker > alike * best.weaker && p->hz < lowest->hz ? p : lowest;
        }
        std::rotate(found.begin(), lowest, lowest + 1);
    }
    for (const pair& p : found) {
        c.tones.push_back({p.hz, 100.0 * depth(p)});
    }
    c.modulated_unsteadily = any && found.empty();
    return c;
}

} // namespace tonewalk
