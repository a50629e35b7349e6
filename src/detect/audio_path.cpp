// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/detect/audio_path.hpp"

#include <algorithm>
#include <cmath>

#include <fmt/format.h>

#include "tonewalk/base/error.hpp"
#include "tonewalk/base/quantity.hpp"

namespace tonewalk {
namespace {

constexpr double default_low_hz = 50.0, least_low_hz = 5.0;
constexpr double widest_band_over_rate = 0.45; // leaves a tenth of the lesser rate to fall off

[[noreturn]] void refuse_band(const audio_band& band, fault kind, std::string_view what,
                              std::string_view mend) {
    throw error{kind, what,
                fmt::format("--band {}:{}", format_option_hz(band.low_hz, false),
                            format_option_hz(band.high_hz, false)),
                mend};
}

double highest_audio_hz(double rate_hz) {
    return widest_band_over_rate * rate_hz;
}

} // namespace

void check_audio_band(const audio_band_request& r) {
    if (!(r.audio_rate_hz >= 8000.0 && r.audio_rate_hz <= 192000.0)) {
        throw error{fault::bad_request, "no such audio rate",
                    fmt::format("--audio-rate {}", r.audio_rate_hz), "give 8000 to 192000"};
    }
    const double highest_hz = highest_audio_hz(r.audio_rate_hz);
    const audio_band band{r.low_hz.value_or(default_low_hz), r.high_hz.value_or(highest_hz), 0.0};
    if (!(band.low_hz >= least_low_hz && band.low_hz < band.high_hz &&
          band.high_hz <= highest_hz)) {
        refuse_band(
            band, fault::bad_request, "no such audio band at this audio rate",
            fmt::format("give LOW:HIGH in Hz, LOW {} or more, HIGH above it and {:.0f} or less",
                        least_low_hz, highest_hz));
    }
}

audio_band choose_audio_band(const audio_band_request& r) {
    check_audio_band(r);
    const double lesser_rate_hz = std::min(r.rate_hz, r.audio_rate_hz);
    const double highest_hz = highest_audio_hz(lesser_rate_hz);
    audio_band band;
    band.low_hz = r.low_hz.value_or(default_low_hz);
    band.high_hz = r.high_hz.value_or(std::min(0.5 * r.width_hz, highest_hz));
    band.stop_hz = std::min(1.25 * band.high_hz, 0.5 * lesser_rate_hz);
    if (band.low_hz >= band.high_hz || band.high_hz > highest_hz) {
        refuse_band(band, fault::malformed, "the band does not fit the channel",
                    fmt::format("give HIGH above LOW and at most {:.0f}, or a greater --width",
                                highest_hz));
    }
    return band;
}

audio_path::audio_path(const config& c, audio_sink& sink)
    : config_{c}, sink_{&sink}, detector_{make_detector(c.detector, c.rate_hz, c.width_hz)},
      remover_{{.rate_hz = c.rate_hz, .low_edge_hz = c.band.low_hz}},
      resampler_{{.input_rate_hz = c.rate_hz,
                  .output_rate_hz = c.audio_rate_hz,
                  .pass_edge_hz = c.band.high_hz,
                  .stop_edge_hz = c.band.stop_hz}},
      origin_s_{c.start_s} {}

void audio_path::begin_stretch(const baseband_stretch& stretch) {
    stretch_ = stretch;
    if (!std::isfinite(origin_s_)) {
        origin_s_ = stretch.start_s;
    }
    if (!stretch.held) {
        return;
    }
    // The first audio sample that does not stand before the stretch; a millionth of one is
    // rounding.
    const double start = (stretch.start_s - origin_s_) * config_.audio_rate_hz;
    const auto first = static_cast<sample_index>(std::ceil(start - 1e-6));
    write_silence_until(first);
    const double past = std::max(0.0, static_cast<double>(written_) - start);
    resampler_.begin(past / config_.audio_rate_hz * config_.rate_hz);
    detector_->begin();
    remover_.begin();
    gaps_.clear();
    silent_.clear();
    detected_.clear();
    muted_ = taken_ = waiting_ = 0;
    last_good_.reset();
}

void audio_path::add(const baseband_block& block) {
    if (!stretch_.held) {
        return;
    }
    gaps_.add(block.non_finite, static_cast<sample_index>(detector_->spread_samples()));
    silent_.add(block.non_finite);
    detector_->add(block.iq, detected_);
    hold_settled();
    pass_on();
}

void audio_path::end_stretch() {
    if (!stretch_.held) {
        return;
    }
    detector_->end(detected_);
    hold_settled();
    for (std::size_t i = 0; i < detected_.size(); ++i) {
        hold(0.0F, false);
    }
    held_.insert(held_.end(), static_cast<std::size_t>(waiting_), 0.0F); // nothing was ever usable
    pass_on();
    remover_.end(alone_);
    resampler_.add(alone_, audio_);
    resampler_.end(audio_);
    alone_.clear();
    write_audio();
}

/// Takes what is known not to belong to the stretch's last, unsettled samples.
void audio_path::hold_settled() {
    if (detected_.size() <= config_.settle_samples) {
        return;
    }
    const std::size_t ready = detected_.size() - config_.settle_samples;
    for (std::size_t i = 0; i < ready; ++i) {
        const bool settled = taken_ >= static_cast<sample_index>(config_.settle_samples);
        hold(detected_[i], settled && !gaps_.contains(taken_));
    }
    detected_.erase(detected_.begin(), detected_.begin() + static_cast<std::ptrdiff_t>(ready));
    gaps_.forget_before(taken_);
}

/// An unusable sample repeats the last usable one, before the first the first: the carrier goes on,
/// and no step of its size enters the band filter.
void audio_path::hold(float value, bool usable) {
    ++taken_;
    if (usable) {
        held_.insert(held_.end(), static_cast<std::size_t>(waiting_), value);
        waiting_ = 0;
        last_good_ = value;
    }
    if (last_good_) {
        held_.push_back(*last_good_);
    } else if (++waiting_ > std::llround(config_.rate_hz)) {
        last_good_ = 0.0F; // a second without any: silence, and bounded memory
        held_.insert(held_.end(), static_cast<std::size_t>(waiting_), 0.0F);
        waiting_ = 0;
    }
}

void audio_path::pass_on() {
    remover_.add(held_, alone_);
    held_.clear();
    resampler_.add(alone_, audio_);
    alone_.clear();
    write_audio();
}

void audio_path::write_audio() {
    for (float& sample : audio_) {
        const sample_index place = resampler_.position(muted_++).whole;
        if (silent_.contains(place)) {
            sample = 0.0F;
        }
    }
    silent_.forget_before(resampler_.position(muted_).whole);
    sink_->add(audio_);
    written_ += static_cast<sample_index>(audio_.size());
    audio_.clear();
}

void audio_path::write_silence_until(sample_index m) {
    const std::vector<float> silence(4096, 0.0F);
    while (written_ < m) {
        const auto part = std::min<sample_index>(m - written_, std::ssize(silence));
        sink_->add(std::span{silence}.first(static_cast<std::size_t>(part)));
        written_ += part;
    }
}

} // namespace tonewalk
