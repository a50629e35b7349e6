// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/meter/compression_watch.hpp"

#include <algorithm>
#include <cmath>
#include <numbers>
#include <vector>

#include <fmt/core.h>

#include "mirrored_lines.hpp"
#include "product_growth.hpp"
#include "stretch_samples.hpp"
#include "tonewalk/maths/distribution.hpp"
#include "tonewalk/maths/quantile.hpp"

namespace tonewalk {
namespace {

constexpr double least_periods = 10.0;     // of the tone in a record: its lines stand apart
constexpr double least_tone_ratio = 100.0; // of the tone's power over its noise
constexpr std::size_t least_strong_records = 20;
constexpr double least_level_range_db = 3.0;
constexpr double significant_sigmas = 6.0;
constexpr double least_compression_db = 0.05;
constexpr double visible_compression_db = 0.5; // what a judgement has to be able to see

/// Records whose tone stands well out of the noise; of weaker ones only the size is known.
std::vector<modulation_lines> strong_ones(const std::vector<modulation_lines>& records,
                                          double line_noise) {
    std::vector<modulation_lines> strong;
    std::copy_if(records.begin(), records.end(), std::back_inserter(strong),
                 [line_noise](const modulation_lines& r) {
                     return std::pow(static_cast<double>(r.tone), 2) >
                            least_tone_ratio * 2.0 * line_noise;
                 });
    return strong;
}

double median_noise(const std::vector<modulation_lines>& records) {
    std::vector<double> powers;
    powers.reserve(records.size());
    for (const modulation_lines& r : records) {
        powers.push_back(static_cast<double>(r.noise));
    }
    // A mean of two exponential powers: its median lies at 0.8392 of the mean.
    return median(std::move(powers)) / 0.8392;
}

double level_range_db(const std::vector<modulation_lines>& records) {
    std::vector<double> carriers;
    carriers.reserve(records.size());
    for (const modulation_lines& r : records) {
        carriers.push_back(static_cast<double>(r.carrier));
    }
    std::sort(carriers.begin(), carriers.end());
    return 20.0 * std::log10(quantile_sorted(carriers, 0.98) / quantile_sorted(carriers, 0.02));
}

note compressed_note(const compression_result& r) {
    return {note_code::compressed, severity::warning,
            fmt::format("the receiver squeezes strong signals: at the highest level the envelope's "
                        "crests come out {:.1g} dB low",
                        r.compression_db.value),
            "record again with less gain or an attenuator: high levels and depths read low"};
}

} // namespace

struct compression_watch::state {
    explicit state(const config& c)
        : set{c}, samples{static_cast<std::size_t>(
                      std::llround(std::max(c.window_s, least_periods / c.tone_hz) * c.rate_hz))},
          weights{hann_weights(samples)}, weighted{samples}, lines{c.rate_hz,
                                                                   samples,
                                                                   {c.tone_hz, 2.0 * c.tone_hz,
                                                                    1.5 * c.tone_hz}} {}

    void measure_complete();
    void measure(std::span<const cf32> record);
    void follow(double peak_hz, double power);

    config set;
    std::size_t samples; // of a record
    std::vector<double> weights;
    sample_runs weighted; // of the record at hand
    mirrored_lines lines; // tone, its second harmonic, and between them what should be empty

    bool held = true; // state of this stretch from here on
    stretch_samples history;
    sample_index next = 0;                                  // first of the record that is awaited
    double carrier_hz = 0.0, power_sum = 0.0, hz_sum = 0.0; // fading memory of the carrier

    std::vector<modulation_lines> records;
};

compression_watch::compression_watch(const config& c) : state_{std::make_unique<state>(c)} {}
compression_watch::~compression_watch() = default;

void compression_watch::begin_stretch(const baseband_stretch& stretch) {
    state& s = *state_;
    s.held = stretch.held;
    s.history.begin();
    s.next = static_cast<sample_index>(s.set.settle_samples);
    s.carrier_hz = s.power_sum = s.hz_sum = 0.0;
}

void compression_watch::add(const baseband_block& block) {
    if (state_->held) {
        state_->history.add(block);
        state_->measure_complete();
    }
}

/// Records whose samples, and the settling samples behind them, have all arrived.
void compression_watch::state::measure_complete() {
    const auto size = static_cast<sample_index>(samples);
    const auto settle = static_cast<sample_index>(set.settle_samples);
    while (next + size + settle <= history.received()) {
        if (!history.touched(next, samples)) {
            measure(history.record(next, samples));
        }
        next += size;
        history.forget_before(next);
    }
}

/// All lines are read at one offset from the carrier, so that what is not known of it droops and
/// turns them alike.
void compression_watch::state::measure(std::span<const cf32> record) {
    weighted.set(record, weights);
    const mirrored_lines::reading read = lines.read(weighted, carrier_hz);
    const double amplitude = std::abs(read.carrier);
    follow(carrier_hz + read.offset_hz, amplitude * amplitude);
    if (amplitude == 0.0) {
        return;
    }
    const cf64 turn_back = std::conj(read.carrier) / amplitude;
    const auto in_envelope = [&turn_back](const mirrored_lines::pair& p) {
        return p.upper * turn_back + std::conj(p.lower * turn_back);
    };
    const auto& [at_tone, at_second, at_nothing] = read.sides;
    const cf64 tone = in_envelope(at_tone), second = in_envelope(at_second);
    const double tone_power = std::norm(tone);
    const double in_step = (second * std::conj(tone * tone)).real();
    records.push_back(
        {static_cast<float>(amplitude), static_cast<float>(std::sqrt(tone_power)),
         static_cast<float>(tone_power > 0.0 ? in_step / tone_power : 0.0),
         static_cast<float>(0.5 * (std::norm(at_nothing.upper) + std::norm(at_nothing.lower)))});
}

void compression_watch::state::follow(double peak_hz, double power) {
    constexpr double memory = 0.8;
    power_sum = memory * power_sum + power;
    hz_sum = memory * hz_sum + power * peak_hz;
    if (power_sum > 0.0) {
        carrier_hz = hz_sum / power_sum;
    }
}

compression_result compression_watch::result() const {
    const state& s = *state_;
    compression_result r;
    if (4.0 * s.set.tone_hz > s.set.width_hz) {
        r.evidence = "the channel is too narrow for the tone's second harmonic";
        return r;
    }
    const double noise = s.records.empty() ? 0.0 : median_noise(s.records);
    const std::vector<modulation_lines> strong = strong_ones(s.records, noise);
    if (strong.size() < least_strong_records) {
        r.evidence = "the tone stands 20 dB out of the noise in too few records";
        return r;
    }
    r.level_range_db = level_range_db(strong);
    if (r.level_range_db < least_level_range_db) {
        r.evidence = fmt::format("the carrier's level moves by {:.1f} dB only: receiver and "
                                 "transmitter cannot be told apart",
                                 r.level_range_db);
        return r;
    }
    const product_growth growth = fit_growth(strong, noise);
    const with_error& bend = growth.from_products;
    r.compression_db.value = crest_loss_db(strong, growth);
    const double error_db = std::abs(r.compression_db.value / bend.value) * bend.error;
    r.compression_db.u95 = two_sided_95 * error_db;
    const bool significant = bend.value < -significant_sigmas * bend.error &&
                             r.compression_db.value >= least_compression_db;
    r.judged = significant || significant_sigmas * error_db <= visible_compression_db;
    r.compressed = significant && depth_agrees(growth);
    r.evidence = fmt::format("over {:.1f} dB of carrier level the tone's second harmonic tells of "
                             "{:.2f} +/- {:.2f} dB of compression at the highest crests",
                             r.level_range_db, r.compression_db.value, r.compression_db.u95);
    if (r.compressed) {
        r.doubts.add(compressed_note(r));
    }
    return r;
}

sheet describe(const compression_result& r) {
    sheet s;
    s.add("compressed", "", r.judged ? cell{r.compressed} : cell{});
    s.add("compression_db", "dB", r.compression_db);
    s.add("level_range_db", "dB", r.level_range_db);
    s.add("evidence", "", r.evidence);
    return s;
}

} // namespace tonewalk
