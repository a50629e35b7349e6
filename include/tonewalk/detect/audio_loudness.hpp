// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstdint>
#include <optional>
#include <span>
#include <vector>

#include "tonewalk/base/estimate.hpp"
#include "tonewalk/base/sample.hpp"
#include "tonewalk/base/sheet.hpp"
#include "tonewalk/detect/audio_sink.hpp"
#include "tonewalk/detect/audio_spool.hpp"

namespace tonewalk {

/// Carrier amplitude against time: the line meter's records, joined by straight lines, held before
/// the first, after the last and where a record gives none.
class carrier_curve {
public:
    carrier_curve() = default;
    /// Ascending times; amplitudes as full scale = 1.0, not finite or not positive where
    /// floor-limited.
    carrier_curve(std::span<const double> time_s, std::span<const double> amplitude);
    [[nodiscard]] bool empty() const noexcept { return time_s_.empty(); }
    [[nodiscard]] double at(double time_s) const noexcept; ///< NaN when empty
    /// Of the records that gave one; NaN when empty.
    [[nodiscard]] double median() const noexcept { return median_; }

private:
    std::vector<double> time_s_, amplitude_;
    double median_ = not_measured;
};

enum class loudness {
    field, ///< keeps the fades: one gain for all
    steady ///< divides by the carrier: 1.0 is 200 % depth
};

struct audio_options {
    loudness mode = loudness::field;
    std::optional<double> gain_db =
        {}; ///< field: --gain; empty: the highest sample stands at -1 dBFS
    double audio_rate_hz = 48000.0;
    sample_index audio_samples =
        0;                ///< exact length, audio_length(): the spool is cut or filled with silence
    double start_s = 0.0; ///< of audio sample 0 on the carrier curve's clock
    bool clamp = true;    ///< integer files: beyond ±1.0 would wrap
};

/// round(span x rate).
[[nodiscard]] sample_index audio_length(double span_s, double audio_rate_hz) noexcept;

struct audio_result {
    double audio_rate_hz = not_measured;
    double audio_seconds = not_measured;
    double gain_db = not_measured; ///< NaN when steady
    double full_scale_depth_percent =
        not_measured; ///< depth of 1.0 in the file; field: at the median carrier
    std::int64_t clipped_audio_samples = 0; ///< beyond ±1.0
};
[[nodiscard]] sheet describe(const audio_result&);

/// Second reading: the closed spool through the gain to the sinks. Silent audio (peak 0) gets a
/// gain of 0 dB. Throws error{bad_request} when `steady` meets a gain or a curve without any
/// carrier.
audio_result render_audio(const audio_spool&, const audio_options&, const carrier_curve&,
                          std::span<audio_sink* const>);

} // namespace tonewalk
