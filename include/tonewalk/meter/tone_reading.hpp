// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <memory>
#include <string_view>
#include <vector>

#include "tonewalk/channel/chain.hpp"
#include "tonewalk/detect/detector.hpp"
#include "tonewalk/detect/sample_gaps.hpp"
#include "tonewalk/maths/window.hpp"
#include "tonewalk/meter/record_grid.hpp"

namespace tonewalk {

/// What a detector's audio shows of the tone, record by record on the line meter's grid: amplitude
/// of the best sine of the tone's frequency, beside a constant, under a Hann window.
class tone_reading final : public baseband_sink {
public:
    struct config {
        detector_kind detector = detector_kind::envelope;
        double width_hz = 0.0; ///< flat width of the channel
        record_grid grid;      ///< the line meter's
        double tone_hz = 0.0;  ///< 0 < tone < rate/2
        double response = 1.0; ///< the channel's amplitude response at the tone: taken off
    };
    explicit tone_reading(const config&);
    void begin_stretch(const baseband_stretch&) override;
    void add(const baseband_block&) override;
    void end_stretch() override;
    void finish() override {}

    /// One value a record, all stretches in order; NaN where missing samples touch the record or
    /// the stretch does not hold the channel. `tone_hz` is the tone as finally found: the droop of
    /// a reading taken beside it is undone.
    [[nodiscard]] std::vector<double> tone_dbfs(double tone_hz) const;
    /// "envelope_tone_dbfs" or "synchronous_tone_dbfs".
    [[nodiscard]] std::string_view column_key() const noexcept;

private:
    void read_records(sample_index complete);
    [[nodiscard]] double read(sample_index first) const;

    config config_;
    std::unique_ptr<detector> detector_;
    window window_;                     // design
    std::vector<double> cosine_, sine_; // design: what a record is multiplied by and summed
    std::vector<double> amplitudes_;
    bool held_ = true; // state of this stretch from here on
    sample_gaps gaps_;
    std::vector<float> audio_; // detected samples from first_ on
    sample_index first_ = 0, inputs_ = 0, record_ = 0;
};

} // namespace tonewalk
