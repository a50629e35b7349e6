// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <memory>
#include <string>

#include "tonewalk/base/estimate.hpp"
#include "tonewalk/base/note.hpp"
#include "tonewalk/base/sheet.hpp"
#include "tonewalk/channel/chain.hpp"

namespace tonewalk {

/// Whether the receiver squeezes strong signals. A receiver's curve bends the tone's envelope: its
/// second harmonic grows with the cube of the carrier and the depth falls as the carrier rises,
/// each in the ratio that the other demands. The transmitter's own distortion keeps its share of
/// the carrier at every level, and so does whatever a linear path makes of both.
struct compression_result {
    bool judged = false;     ///< false: `evidence` says what was missing
    bool compressed = false; ///< 6 standard errors, 0.05 dB and more
    estimate compression_db; ///< what the envelope's crests lose at the highest carrier level
    double level_range_db = not_measured; ///< of the carrier, in the records that were used
    std::string evidence;
    note_set doubts; ///< compressed
};
/// compressed (null when not judged), compression_db, level_range_db, evidence.
[[nodiscard]] sheet describe(const compression_result&);

/// Listens beside the line meter and reads carrier, tone and second harmonic from Hann-windowed
/// records that do not overlap. Nothing depends on how samples are cut.
///   memory  one record, and 16 bytes for each record gone by
class compression_watch final : public baseband_sink {
public:
    struct config {
        double rate_hz = 0.0;           ///< of the baseband samples, > 0
        double tone_hz = 0.0;           ///< > 0, as the opening gave it
        double width_hz = 0.0;          ///< flat width of the channel, > 0
        double window_s = 0.2;          ///< of a record; ten periods of the tone where that is more
        std::size_t settle_samples = 0; ///< half the channel's whole filter, left out at both ends
    };
    explicit compression_watch(const config&);
    ~compression_watch() override;
    void begin_stretch(const baseband_stretch&) override;
    void add(const baseband_block&) override;
    void end_stretch() override {}
    void finish() override {}
    [[nodiscard]] compression_result result() const;

private:
    struct state;
    std::unique_ptr<state> state_;
};

} // namespace tonewalk
