// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <complex>
#include <vector>

#include "tonewalk/detect/detector.hpp"
#include "tonewalk/detect/narrow_low_pass.hpp"

namespace tonewalk {

/// The part of the samples in phase with the carrier. Noise across the carrier does not enter, so
/// that the tone stays true where an envelope would sink.
///
/// The carrier's phase is that of a centred average of the samples: linear phase, flat to 8 Hz and
/// gone from 32 Hz on (noise bandwidth about 40 Hz). Symmetric sidebands inside the average do not
/// turn it. The average stands in a frame whose frequency follows the carrier, so a carrier up to 8
/// Hz off its nominal counts at once, up to some 15 Hz after the first half second, and a drift of
/// up to 10 Hz/s is followed without end. The frame's frequency comes from the average's own phase
/// over 25 ms, weighted by power with a memory of 0.25 s; where that is not a steady line
/// (coherence below 0.7: a deep fade, no carrier) the frame keeps its frequency, also across the
/// gap between two stretches. It moves in ramps of one hop, so no step enters the audio. Within
/// lag_samples() of a stretch's ends the average sees one side only: there a carrier off by f Hz
/// costs up to about f/50 turns of phase until the frame has caught it.
class synchronous_detector final : public detector {
public:
    struct config {
        double rate_hz = 0.0;         ///< > 64
        double pass_edge_hz = 8.0;    ///< of the carrier's average
        double stop_edge_hz = 32.0;   ///< of the carrier's average
        double phase_span_s = 0.025;  ///< over which the carrier's frequency is read
        double memory_s = 0.25;       ///< of that reading
        double hop_s = 0.25;          ///< between changes of the frame's frequency
        double least_coherence = 0.7; ///< below: the frame keeps its frequency
    };
    explicit synchronous_detector(const config&); ///< throws error{bad_request}
    void begin() override;
    void add(std::span<const cf32> in, std::vector<float>& out) override;
    void end(std::vector<float>& out) override;
    [[nodiscard]] std::size_t lag_samples() const noexcept override {
        return narrow_.reach_samples();
    }
    [[nodiscard]] std::size_t spread_samples() const noexcept override { return 0; }
    /// The frame's frequency at the last sample added, Hz from the nominal carrier.
    [[nodiscard]] double frame_hz() const noexcept;

private:
    struct pending { // a sample that waits for its carrier
        cf32 in_frame;
        cf64 turn; // from the frame back to the nominal carrier
    };
    void rotate(std::span<const cf32> in);
    void detect(std::vector<float>& out);
    void observe(cf64 carrier);
    void next_hop();
    [[nodiscard]] double turns_at(double sample) const noexcept;

    config config_;
    narrow_low_pass<cf32> narrow_;
    std::size_t hop_samples_, span_averages_; // design
    double decay_;                            // design: of the memory, per decimated average
    std::vector<cf32> rotated_, carrier_;     // scratch
    std::vector<pending> pending_;            // state
    std::vector<cf64> averages_;              // state: the last span_averages_, a ring
    std::size_t averages_seen_ = 0;           // state
    sample_index outputs_ = 0;                // state
    std::size_t in_hop_ = 0;                  // state: samples of this hop so far
    double hop_turns_ = 0.0;                  // state: the frame's phase at the hop's start
    double hop_hz_ = 0.0, next_hop_hz_ = 0.0; // state: the frame's frequency at the hop's ends
    cf64 lagged_power_;                       // state: sum of c(t) c*(t - span)
    double power_ = 0.0;                      // state: sum of |c(t)| |c(t - span)|
};

} // namespace tonewalk
