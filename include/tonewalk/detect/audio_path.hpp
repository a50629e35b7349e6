// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <memory>
#include <optional>
#include <vector>

#include "tonewalk/base/estimate.hpp"
#include "tonewalk/channel/chain.hpp"
#include "tonewalk/detect/audio_resampler.hpp"
#include "tonewalk/detect/audio_sink.hpp"
#include "tonewalk/detect/carrier_remover.hpp"
#include "tonewalk/detect/detector.hpp"
#include "tonewalk/detect/sample_gaps.hpp"

namespace tonewalk {

/// The audio band, flat within 0.1 dB, and where its upper stop band begins.
struct audio_band {
    double low_hz = 0.0, high_hz = 0.0, stop_hz = 0.0;
};
struct audio_band_request {
    double rate_hz = 0.0;               ///< of the baseband samples
    double width_hz = 0.0;              ///< flat width of the channel
    double audio_rate_hz = 48000.0;     ///< 8000 to 192000
    std::optional<double> low_hz = {};  ///< --band; empty: 50 Hz
    std::optional<double> high_hz = {}; ///< --band; empty: half the width, or what the rates hold
};
/// What can be told without the recording: throws error{bad_request} naming --band or --audio-rate.
void check_audio_band(const audio_band_request&);
/// Checks that first; throws error{malformed} where the recording does not hold the band.
[[nodiscard]] audio_band choose_audio_band(const audio_band_request&);

/// From baseband samples to audio: detect, take the carrier off, limit the band, change the rate,
/// and lay it on one time line. Audio sample m stands m / audio_rate after the start; gaps between
/// stretches, stretches that do not hold the channel and missing samples become silence of equal
/// length. Audio is in units of full scale, before any gain. Every delay is removed. The end is
/// that of the last stretch to within a baseband sample: render_audio cuts to the exact length.
class audio_path final : public baseband_sink {
public:
    struct config {
        double rate_hz = 0.0;  ///< of the baseband samples
        double width_hz = 0.0; ///< flat width of the channel
        detector_kind detector = detector_kind::envelope;
        double audio_rate_hz = 48000.0;
        audio_band band;               ///< from choose_audio_band
        double start_s = not_measured; ///< of audio sample 0, from the recording's first sample;
                                       ///< NaN: of the first stretch
        std::size_t settle_samples =
            0; ///< of the channel: that much at a stretch's ends is held, not detected
    };
    audio_path(const config&, audio_sink&); ///< the sink outlives the path
    void begin_stretch(const baseband_stretch&) override;
    void add(const baseband_block&) override;
    void end_stretch() override;
    void finish() override {}
    [[nodiscard]] sample_index audio_samples() const noexcept { return written_; }

private:
    void hold_settled();
    void hold(float value, bool usable);
    void pass_on();
    void write_audio();
    void write_silence_until(sample_index m);

    config config_;
    audio_sink* sink_;
    std::unique_ptr<detector> detector_;
    carrier_remover remover_;
    audio_resampler resampler_;
    sample_gaps gaps_;   // of this stretch, baseband indices, detector's spread included
    sample_gaps silent_; // of this stretch, baseband indices, as given
    std::vector<float> detected_, held_, alone_,
        audio_; // scratch; detected_ keeps what waits for settling
    baseband_stretch stretch_;
    double origin_s_ = not_measured;
    sample_index written_ = 0; // audio samples handed on
    sample_index muted_ = 0;   // resampler outputs looked at in this stretch
    sample_index taken_ = 0;   // detected samples that went on, this stretch
    sample_index waiting_ = 0; // unusable samples at the stretch's start, value not yet known
    std::optional<float> last_good_;
};

} // namespace tonewalk
