// SPDX-License-Identifier: GPL-3.0-or-later
#include "close_look.hpp"

#include <algorithm>
#include <cmath>

#include <fmt/core.h>

#include "carrier_parts.hpp"
#include "channel_width.hpp"
#include "decimator.hpp"
#include "tonewalk/base/error.hpp"
#include "tonewalk/base/random.hpp"
#include "tonewalk/maths/fir.hpp"

namespace tonewalk {
namespace {

constexpr double look_rate_hz = 32e3; // at least, where the recording has it
constexpr double look_half_hz = 13e3; // flat; tones reach 12 kHz
constexpr double lowest_tone_hz = 20.0, highest_tone_hz = 12e3;
constexpr double lowest_voice_hz = 80.0, highest_voice_hz = 4e3;
const double strongest_sideband =
    decibel::from_db(-2.5).power_ratio();                 // of the carrier: 150 % depth
constexpr double tone_reach = 0.02, least_reach_hz = 2.0; // of a tone that was asked for
constexpr double weak_hum_depth = 0.05;
constexpr double least_depth = 0.001; // fainter pairs are rounding, or a converter's spurs
const double alike = decibel::from_db(-1.0).power_ratio();
constexpr std::size_t most_pairs = 24;
// Parts of 0.125 s tell tones from syllables; tones below 40 Hz need longer ones.
constexpr double part_s = 0.125, long_part_s = 0.25, lowest_in_part_hz = 40.0;
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

std::vector<decimator> design_filters(double rate_hz) {
    std::vector<decimator> filters;
    const auto total = static_cast<std::size_t>(std::max(1.0, rate_hz / look_rate_hz));
    for (const std::size_t step : decimation_steps(total)) {
        const double next_hz = rate_hz / static_cast<double>(step);
        filters.emplace_back(design_low_pass({.rate_hz = rate_hz,
                                              .pass_edge_hz = look_half_hz,
                                              .stop_edge_hz = next_hz - look_half_hz,
                                              .attenuation_db = 90.0}),
                             rate_hz, step);
        filters.back().begin(0);
        rate_hz = next_hz;
    }
    return filters;
}

/// Turns each sample back by `step` more than the one before; `first` is the index of the first.
void mix_down(std::span<cf32> run, std::uint64_t step, std::size_t first) {
    const exact_sine_cosine start = exact_turn(step * first), by = exact_turn(step);
    double cosine = start.cosine, sine = -start.sine;
    for (cf32& z : run) {
        const double re = static_cast<double>(z.real()), im = static_cast<double>(z.imag());
        z = {static_cast<float>(re * cosine - im * sine),
             static_cast<float>(re * sine + im * cosine)};
        const double next = cosine * by.cosine + sine * by.sine;
        sine = sine * by.cosine - cosine * by.sine;
        cosine = next;
    }
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
    : facts_{what.facts}, offset_hz_{offset_hz},
      band_low_hz_{what.facts->format.is_complex ? -what.facts->sample_rate_hz / 2.0 : 0.0},
      band_high_hz_{what.facts->sample_rate_hz / 2.0}, rate_hz_{what.facts->sample_rate_hz} {
    std::vector<decimator> filters = design_filters(rate_hz_);
    for (const decimator& filter : filters) {
        rate_hz_ = filter.output_rate_hz();
    }
    const std::uint64_t step = phase_step(offset_hz, what.facts->sample_rate_hz);
    std::vector<cf32> run, next;
    for (std::size_t first = 0; first < what.frames; first += convert_run) {
        run.resize(std::min(convert_run, what.frames - first));
        what.convert(first, run);
        mix_down(run, step, first);
        for (decimator& filter : filters) {
            next.clear();
            filter.add(run, next);
            run.swap(next);
        }
        samples_.insert(samples_.end(), run.begin(), run.end());
    }
    constexpr std::size_t least_samples = 16;
    if (samples_.size() < least_samples) {
        throw error{fault::malformed,
                    fmt::format("lasts {:g} s, too short to find a signal in",
                                static_cast<double>(what.frames) / what.facts->sample_rate_hz),
                    what.facts->where(), "give a longer recording, or correct --rate"};
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
    const auto bin = spectrum_->strongest(-reach_hz, reach_hz);
    return bin ? std::optional<double>{spectrum_->peak_at(*bin).hz} : std::nullopt;
}

double close_look::power_at(double hz) const {
    const std::size_t bin = spectrum_->bin_of(hz);
    return spectrum_->is_line(bin) ? spectrum_->peak_at(bin).power : spectrum_->power(bin);
}

/// The pair whose upper line stands at a bin, with the strongest line near its mirror place.
std::optional<close_look::pair> close_look::pair_at(std::size_t upper_bin, double carrier_hz,
                                                    double most_power) const {
    constexpr double mirror_bins = 2.0;
    const line_spectrum::peak upper = spectrum_->peak_at(upper_bin);
    const double mirror_hz = 2.0 * carrier_hz - upper.hz,
                 reach_hz = mirror_bins * spectrum_->bin_hz();
    const auto mirror = spectrum_->strongest(mirror_hz - reach_hz, mirror_hz + reach_hz);
    if (!in_band(mirror_hz) || !mirror) {
        return std::nullopt;
    }
    const line_spectrum::peak lower = spectrum_->peak_at(*mirror);
    const double weaker = std::min(upper.power, lower.power),
                 stronger = std::max(upper.power, lower.power);
    if (stronger > most_power || stronger > mirror_ratio * weaker) {
        return std::nullopt;
    }
    return pair{0.5 * (upper.hz - lower.hz), weaker, upper.power + lower.power};
}

/// Lines that mirror each other about the carrier, strongest first.
std::vector<close_look::pair> close_look::pairs(double carrier_hz, double carrier_power,
                                                double low_hz, double high_hz) const {
    constexpr double least_bins = 5.0; // no line is told from the carrier's own inside it
    const double least_hz = std::max(low_hz, least_bins * spectrum_->bin_hz());
    const std::size_t first = spectrum_->bin_of(carrier_hz + least_hz),
                      last = spectrum_->bin_of(carrier_hz + high_hz);
    std::vector<pair> found;
    for (std::size_t k = first; k <= last && in_band(spectrum_->peak_at(k).hz); ++k) {
        if (!spectrum_->is_line(k)) {
            continue;
        }
        const auto p = pair_at(k, carrier_hz, strongest_sideband * carrier_power);
        if (p && p->hz >= least_hz && p->hz <= high_hz) {
            found.push_back(*p);
        }
    }
    std::sort(found.begin(), found.end(),
              [](const pair& a, const pair& b) { return a.weaker > b.weaker; });
    return found;
}

void close_look::keep_steady(std::vector<pair>& found, double carrier_hz,
                             double carrier_power) const {
    found.resize(std::min(found.size(), most_pairs));
    std::optional<carrier_parts> usual, longer;
    const auto parts_for = [&](double tone_hz) -> const carrier_parts& {
        std::optional<carrier_parts>& parts = tone_hz < lowest_in_part_hz ? longer : usual;
        if (!parts) {
            parts.emplace(samples_, rate_hz_, carrier_hz,
                          tone_hz < lowest_in_part_hz ? long_part_s : part_s);
        }
        return *parts;
    };
    std::vector<pair> steady;
    for (pair p : found) {
        const double depth = p.depth(carrier_power);
        const auto hz = depth < least_depth
                            ? std::nullopt
                            : parts_for(p.hz).steady_tone(
                                  p.hz, depth, spectrum_->noise_density(carrier_hz + p.hz));
        if (hz) {
            p.hz = *hz;
            steady.push_back(p);
        }
    }
    found.swap(steady);
}

found_carrier close_look::describe(double hz, std::optional<double> wanted_tone_hz) const {
    found_carrier c;
    c.offset_hz = offset_hz_ + hz;
    const double power = power_at(hz);
    c.level_dbfs = decibel::from_power_ratio(power).db();
    c.carrier_to_noise_density_dbhz =
        decibel::from_power_ratio(power / spectrum_->noise_density(hz)).db();
    double low_hz = lowest_tone_hz, high_hz = highest_tone_hz;
    if (wanted_tone_hz) {
        const double reach_hz = std::max(least_reach_hz, tone_reach * *wanted_tone_hz);
        low_hz = *wanted_tone_hz - reach_hz;
        high_hz = *wanted_tone_hz + reach_hz;
    }
    std::vector<pair> found = pairs(hz, power, low_hz, high_hz);
    if (!wanted_tone_hz) {
        keep_steady(found, hz, power);
    }
    const auto is_hum = [&](const pair& p) {
        return is_mains_multiple(p.hz) && p.depth(power) < weak_hum_depth;
    };
    std::stable_partition(found.begin(), found.end(), [&](const pair& p) { return !is_hum(p); });
    if (!found.empty()) { // within 1 dB of the best, the lowest frequency
        const pair best = found.front();
        auto lowest = found.begin();
        for (auto p = found.begin(); p != found.end() && is_hum(*p) == is_hum(best); ++p) {
            lowest = p->weaker > alike * best.weaker && p->hz < lowest->hz ? p : lowest;
        }
        std::rotate(found.begin(), lowest, lowest + 1);
    }
    for (const pair& p : found) {
        c.tones.push_back({p.hz, 100.0 * p.depth(power)});
    }
    const std::optional<double> tone_hz =
        c.tones.empty() ? std::nullopt : std::optional{c.tones.front().frequency_hz};
    const channel_width width = automatic_width(c.offset_hz, tone_hz, *facts_);
    c.width_hz = width.fits() ? width.hz() : not_measured;
    const double voice_top_hz = std::min(highest_voice_hz, rate_hz_ / 2.0);
    c.modulated_unsteadily = carrier_parts{samples_, rate_hz_, hz, part_s}.in_step(
        lowest_voice_hz, voice_top_hz, c.tones);
    return c;
}

} // namespace tonewalk
