// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/detect/audio_loudness.hpp"

#include <algorithm>
#include <cassert>
#include <cmath>
#include <utility>

#include "tonewalk/base/decibel.hpp"
#include "tonewalk/base/error.hpp"
#include "tonewalk/maths/quantile.hpp"

namespace tonewalk {
namespace {

constexpr double field_peak_db = -1.0;
constexpr double steady_full_scale = 2.0; // 200 % depth

void check(const audio_options& o, const carrier_curve& carrier) {
    if (o.mode == loudness::field) {
        return;
    }
    if (o.gain_db) {
        throw error{fault::bad_request, "steady loudness has no gain to choose", "--gain",
                    "leave it out or take --loudness field"};
    }
    if (carrier.empty()) {
        throw error{fault::malformed, "no record shows a carrier to divide by", "--loudness steady",
                    "take --loudness field"};
    }
}

double field_gain_db(const audio_options& o, const audio_spool& spool) {
    if (o.gain_db) {
        return *o.gain_db;
    }
    const auto peak = static_cast<double>(spool.peak());
    return peak > 0.0 ? field_peak_db - decibel::from_amplitude_ratio(peak).db() : 0.0;
}

/// Reads samples [first, first + out.size()); silence beyond the spool's end.
void read_padded(const audio_spool& spool, sample_index first, std::span<float> out) {
    const auto there = std::clamp<sample_index>(spool.samples() - first, 0, std::ssize(out));
    spool.read(std::min(first, spool.samples()), out.first(static_cast<std::size_t>(there)));
    std::fill(out.begin() + there, out.end(), 0.0F);
}

std::int64_t limit(std::span<float> audio, bool clamp) noexcept {
    std::int64_t beyond = 0;
    for (float& sample : audio) {
        if (std::abs(sample) > 1.0F) {
            ++beyond;
            sample = clamp ? std::copysign(1.0F, sample) : sample;
        }
    }
    return beyond;
}

} // namespace

carrier_curve::carrier_curve(std::span<const double> time_s, std::span<const double> amplitude) {
    assert(time_s.size() == amplitude.size());
    std::vector<double> measured;
    for (std::size_t i = 0; i < time_s.size(); ++i) {
        if (std::isfinite(amplitude[i]) && amplitude[i] > 0.0) {
            measured.push_back(amplitude[i]);
        }
        if (!measured.empty()) {
            time_s_.push_back(time_s[i]);
            amplitude_.push_back(measured.back());
        }
    }
    median_ = tonewalk::median(std::move(measured));
}

double carrier_curve::at(double time_s) const noexcept {
    if (empty()) {
        return not_measured;
    }
    const auto after = std::upper_bound(time_s_.begin(), time_s_.end(), time_s) - time_s_.begin();
    if (after == 0) {
        return amplitude_.front();
    }
    if (after == std::ssize(time_s_)) {
        return amplitude_.back();
    }
    const auto i = static_cast<std::size_t>(after);
    const double share = (time_s - time_s_[i - 1]) / (time_s_[i] - time_s_[i - 1]);
    return amplitude_[i - 1] + share * (amplitude_[i] - amplitude_[i - 1]);
}

sample_index audio_length(double span_s, double audio_rate_hz) noexcept {
    return std::llround(span_s * audio_rate_hz);
}

sheet describe(const audio_result& r) {
    sheet out;
    out.add("audio_rate_hz", "Hz", r.audio_rate_hz);
    out.add("audio_seconds", "s", r.audio_seconds);
    out.add("gain_db", "dB", r.gain_db);
    out.add("full_scale_depth_percent", "%", r.full_scale_depth_percent);
    out.add("clipped_audio_samples", "", r.clipped_audio_samples);
    return out;
}

audio_result render_audio(const audio_spool& spool, const audio_options& o,
                          const carrier_curve& carrier, std::span<audio_sink* const> sinks) {
    check(o, carrier);
    const bool steady = o.mode == loudness::steady;
    audio_result result;
    result.audio_rate_hz = o.audio_rate_hz;
    result.audio_seconds = static_cast<double>(o.audio_samples) / o.audio_rate_hz;
    result.gain_db = steady ? not_measured : field_gain_db(o, spool);
    const double gain = steady ? 1.0 : decibel::from_db(result.gain_db).amplitude_ratio();
    result.full_scale_depth_percent =
        100.0 * (steady ? steady_full_scale : 1.0 / (gain * carrier.median()));

    std::vector<float> audio(4096);
    for (sample_index first = 0; first < o.audio_samples; first += std::ssize(audio)) {
        audio.resize(static_cast<std::size_t>(
            std::min<sample_index>(o.audio_samples - first, std::ssize(audio))));
        read_padded(spool, first, audio);
        for (std::size_t i = 0; i < audio.size(); ++i) {
            const double time_s =
                o.start_s +
                static_cast<double>(first + static_cast<sample_index>(i)) / o.audio_rate_hz;
            const double factor = steady ? 1.0 / (steady_full_scale * carrier.at(time_s)) : gain;
            audio[i] = static_cast<float>(factor * static_cast<double>(audio[i]));
        }
        result.clipped_audio_samples += limit(audio, o.clamp);
        for (audio_sink* sink : sinks) {
            sink->add(audio);
        }
    }
    return result;
}

} // namespace tonewalk
