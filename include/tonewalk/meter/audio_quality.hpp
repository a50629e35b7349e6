// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <vector>

#include "tonewalk/base/estimate.hpp"
#include "tonewalk/base/sample.hpp"
#include "tonewalk/base/sheet.hpp"
#include "tonewalk/detect/audio_sink.hpp"
#include "tonewalk/maths/fft.hpp"
#include "tonewalk/maths/window.hpp"

namespace tonewalk {

/// The tone in finished audio. All NaN where no line stands 10 dB over the noise in its own width.
struct audio_quality {
    double frequency_hz = not_measured;
    double level_dbfs = not_measured; ///< 0 dBFS: a sine of amplitude 1
    double snr_db = not_measured;     ///< tone power over all in the band but tone and harmonics
    double thd_percent =
        not_measured; ///< harmonics 2 to 10 inside the band, re fundamental; NaN: none inside, or
                      ///< lost in noise that is larger than they and than 1 % of the tone
};
[[nodiscard]] sheet describe(const audio_quality&);

/// Listens to finished audio: half-overlapping Blackman-Harris segments of about half a second (all
/// the audio where there is less), averaged in power. Silence of 16 samples and more is a gap; no
/// segment spans one. A line is what stands within 12 Hz of it (at least 5 bins, at most 0.45 of
/// the tone's frequency), so a tone that fades keeps its power; the level is then the rms over
/// time, strong parts weigh most, and fading quicker than 12 Hz counts as noise.
class audio_quality_meter final : public audio_sink {
public:
    struct config {
        double audio_rate_hz = 48000.0;
        sample_index audio_samples = 0; ///< how long the audio will be
        double low_hz = 50.0;           ///< the audio band
        double high_hz = 10000.0;       ///< the audio band, below audio_rate/2
        double tone_hz =
            not_measured; ///< where the tone is known to be, within 2 %; NaN: the strongest line
    };
    explicit audio_quality_meter(const config&);
    void add(std::span<const float>) override;
    [[nodiscard]] audio_quality result() const;

private:
    void take(float sample);
    void add_segment();
    [[nodiscard]] double bin_hz() const noexcept;
    [[nodiscard]] double frequency_at(std::size_t peak) const;

    config config_;
    window window_; // design
    fft transform_;
    std::vector<float> segment_; // state: samples of the segment that is filling
    std::size_t silent_ = 0;     // state: zeros in a row
    bool follows_ = false;       // state: the last segment overlaps the next one
    std::vector<cf32> last_;     // state: the last segment's spectrum
    std::vector<double> power_;  // state: sum over segments, bins 0 to size/2
    std::vector<cf64> turn_;     // state: sum of spectrum times the last one's conjugate
    std::size_t segments_ = 0;   // state
};

} // namespace tonewalk
