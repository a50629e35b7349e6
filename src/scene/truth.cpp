// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/scene/truth.hpp"

#include <algorithm>
#include <cmath>
#include <limits>
#include <utility>

#include "carrier_signal.hpp"
#include "exact.hpp"
#include "receiver.hpp"
#include "tonewalk/base/estimate.hpp"
#include "waveform_truth.hpp"

namespace tonewalk {
namespace {

constexpr std::size_t nowhere = std::numeric_limits<std::size_t>::max();
constexpr double turning_ratio = 1.413; // 3 dB: what counts as a peak or a null

/// What a carrier's lines meet on their way at one moment.
class carrier_view {
public:
    carrier_view(const scene& whole, std::size_t carrier)
        : whole_{&whole}, carrier_{&whole.carriers[carrier]}, amplitude_{amplitude_from_db(
                                                                  carrier_->level_dbfs)},
          course_{*carrier_}, common_{*carrier_, whole.path}, groups_{wave_groups(*carrier_)} {
        if (whole.path.resonator)
            resonance_.emplace(*whole.path.resonator);
    }

    void enter(std::size_t stretch, std::optional<double> centre_hz) {
        if (stretch == stretch_)
            return;
        stretch_ = stretch;
        tuning_ = tuned(*whole_, *carrier_, centre_hz);
        sums_.clear();
        if (tuning_)
            for (const wave_group& group : groups_)
                sums_.emplace_back(group.waves, whole_->path, wavelength_m(tuning_->frequency_hz));
    }

    [[nodiscard]] bool on(double time_s) const noexcept {
        return tuning_ && carrier_->start_s <= time_s - groups_.front().delay_s &&
               time_s - groups_.front().delay_s < carrier_->stop_s;
    }

    [[nodiscard]] double offset_hz(double time_s) const noexcept {
        return tuning_->offset_hz + course_.deviation_hz(time_s);
    }

    /// Complex gain of the line that lies `line_hz` from the carrier.
    [[nodiscard]] cf64 transfer(double time_s, double line_hz) noexcept {
        const double from_centre_hz = offset_hz(time_s) + line_hz;
        cf64 sum{};
        for (std::size_t k = 0; k < groups_.size(); ++k)
            sum += product(sums_[k].at(time_s),
                           unit_vector(0U - phase_from_turns(from_centre_hz * groups_[k].delay_s)));
        sum = product(sum, common_.at(time_s));
        if (!resonance_)
            return sum;
        const double absolute_hz = tuning_->frequency_hz + course_.deviation_hz(time_s) + line_hz;
        return product(sum, resonance_->at(absolute_hz));
    }

    [[nodiscard]] double level() const noexcept { return amplitude_; }

    /// Kept while the same tones sound.
    [[nodiscard]] const waveform_truth& waveform(double time_s) {
        std::vector<bool> sounding;
        for (const scene_tone& tone : carrier_->tones)
            sounding.push_back(tone.start_s <= time_s && time_s < tone.stop_s);
        if (!waveform_ || sounding != sounding_) {
            waveform_ = waveform_at(*carrier_, time_s);
            sounding_ = std::move(sounding);
        }
        return *waveform_;
    }

private:
    const scene* whole_;
    const scene_carrier* carrier_;
    double amplitude_;
    frequency_course course_;
    common_factor common_;
    std::vector<wave_group> groups_;
    std::optional<resonance> resonance_;
    std::size_t stretch_ = nowhere;
    std::optional<carrier_tuning> tuning_;
    std::vector<wave_sum> sums_;
    std::vector<bool> sounding_;
    std::optional<waveform_truth> waveform_;
};

/// The tone that two sideband lines make in the envelope of a carrier line.
double envelope_tone(cf64 carrier, cf64 above, cf64 below) noexcept {
    const double size = magnitude(carrier);
    if (size == 0.0)
        return std::sqrt(2.0 * (squared_magnitude(above) + squared_magnitude(below)));
    const cf64 towards = std::conj(carrier) / size;
    return magnitude(product(above, towards) + std::conj(product(below, towards)));
}

} // namespace

struct scene_truth::state {
    explicit state(scene given) : whole{std::move(given)}, stretches{scene_layout(whole)} {
        for (std::size_t k = 0; k < whole.carriers.size(); ++k)
            views.emplace_back(whole, k);
    }

    /// The stretch that holds a time, or the one before the gap that does.
    [[nodiscard]] std::size_t stretch_at(double time_s) const {
        const auto after =
            std::upper_bound(stretches.begin(), stretches.end(), sample_at(time_s, whole.rate_hz),
                             [](sample_index position, const scene_stretch& each) {
                                 return position < each.position;
                             });
        return after == stretches.begin() ? 0
                                          : static_cast<std::size_t>(after - stretches.begin()) - 1;
    }

    carrier_view& view(std::size_t carrier, double time_s) {
        const std::size_t stretch = stretch_at(time_s);
        views[carrier].enter(stretch, stretches[stretch].centre_hz);
        return views[carrier];
    }

    [[nodiscard]] double gain(double time_s) const noexcept {
        return amplitude_from_db(stepped_gain_db(whole.receiver, time_s));
    }

    double amplitude(std::size_t carrier, double time_s) {
        carrier_view& seen = view(carrier, time_s);
        return seen.on(time_s) ? seen.level() * gain(time_s) * magnitude(seen.transfer(time_s, 0.0))
                               : 0.0;
    }

    /// By thirds: the level has one turn within a grid step either side.
    double turning_time_s(std::size_t carrier, double middle_s, bool is_peak) {
        const double sign = is_peak ? 1.0 : -1.0;
        double low_s = middle_s - whole.truth_every_s, high_s = middle_s + whole.truth_every_s;
        for (int round = 0; round < 80; ++round) {
            const double third_s = (high_s - low_s) / 3.0;
            if (sign * amplitude(carrier, low_s + third_s) <
                sign * amplitude(carrier, high_s - third_s))
                low_s += third_s;
            else
                high_s -= third_s;
        }
        return 0.5 * (low_s + high_s);
    }

    scene whole;
    std::vector<scene_stretch> stretches;
    std::vector<carrier_view> views;
};

scene_truth::scene_truth(const scene& whole) {
    check_scene(whole, "scene");
    state_ = std::make_unique<state>(whole);
}
scene_truth::scene_truth(scene_truth&&) noexcept = default;
scene_truth& scene_truth::operator=(scene_truth&&) noexcept = default;
scene_truth::~scene_truth() = default;

carrier_truth scene_truth::at(std::size_t carrier, double time_s) const {
    const std::vector<scene_tone>& tones = state_->whole.carriers[carrier].tones;
    carrier_view& seen = state_->view(carrier, time_s);
    carrier_truth truth;
    truth.tone_amplitudes.assign(tones.size(), 0.0);
    if (!seen.on(time_s))
        return truth;
    const double level = seen.level() * state_->gain(time_s);
    const waveform_truth& waveform = seen.waveform(time_s);
    truth.on = true;
    truth.field = seen.transfer(time_s, 0.0);
    truth.offset_hz = seen.offset_hz(time_s);
    truth.carrier_amplitude = level * magnitude(truth.field);
    truth.line_amplitude = truth.carrier_amplitude * waveform.line;
    for (std::size_t k = 0; k < tones.size(); ++k) {
        const double half = 0.5 * level * waveform.tones[k];
        truth.tone_amplitudes[k] =
            envelope_tone(truth.field, half * seen.transfer(time_s, tones[k].frequency_hz),
                          half * seen.transfer(time_s, -tones[k].frequency_hz));
    }
    return truth;
}

cf64 scene_truth::mean_carrier(std::size_t carrier, double start_s, double window_s) const {
    constexpr std::size_t points = 2048;
    cf64 sum{};
    double weights = 0.0;
    for (std::size_t k = 0; k < points; ++k) {
        const double through = (static_cast<double>(k) + 0.5) / points;
        const double time_s = start_s + window_s * through;
        const double weight = 1.0 - exact_turn(phase_from_turns(through)).cosine;
        weights += weight;
        carrier_view& seen = state_->view(carrier, time_s);
        if (seen.on(time_s))
            sum += weight * seen.level() * state_->gain(time_s) * seen.waveform(time_s).line *
                   seen.transfer(time_s, 0.0);
    }
    return sum / weights;
}

namespace {

struct turn {
    std::size_t index;
    bool is_peak;
};

/// Walks a series with hysteresis; its first and last values are no turns, NaN begins it anew.
std::vector<turn> turns_of(const std::vector<double>& values) {
    enum class way { undecided, rising, falling } going = way::undecided;
    std::vector<turn> found;
    std::size_t begin = 0, high = 0, low = 0;
    for (std::size_t k = 0; k < values.size(); ++k) {
        if (std::isnan(values[k]) || k == begin) {
            begin = std::isnan(values[k]) ? k + 1 : k;
            high = low = begin;
            going = way::undecided;
            continue;
        }
        high = values[k] > values[high] ? k : high;
        low = values[k] < values[low] ? k : low;
        if (going != way::rising && low < k && values[k] >= turning_ratio * values[low]) {
            if (low != begin)
                found.push_back({low, false});
            going = way::rising;
            high = k;
        } else if (going != way::falling && high < k && turning_ratio * values[k] <= values[high]) {
            if (high != begin)
                found.push_back({high, true});
            going = way::falling;
            low = k;
        }
    }
    return found;
}

} // namespace

std::vector<scene_truth::extremum> scene_truth::extrema(std::size_t carrier) const {
    const double every_s = state_->whole.truth_every_s;
    std::vector<double> amplitudes(static_cast<std::size_t>(scene_span_s(state_->whole) / every_s) +
                                   1);
    for (std::size_t k = 0; k < amplitudes.size(); ++k) {
        const double time_s = static_cast<double>(k) * every_s;
        amplitudes[k] = state_->view(carrier, time_s).on(time_s)
                            ? state_->amplitude(carrier, time_s)
                            : not_measured;
    }
    std::vector<extremum> found;
    for (const turn& each : turns_of(amplitudes)) {
        const double middle_s = static_cast<double>(each.index) * every_s;
        const double time_s = state_->turning_time_s(carrier, middle_s, each.is_peak);
        found.push_back(
            {each.is_peak, time_s, db_from_amplitude(state_->amplitude(carrier, time_s))});
    }
    return found;
}

carrier_truth truth_at(const scene& whole, std::size_t carrier, double time_s) {
    return scene_truth{whole}.at(carrier, time_s);
}

} // namespace tonewalk
