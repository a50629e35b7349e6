// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <functional>
#include <memory>
#include <optional>

#include "tonewalk/channel/chain.hpp"
#include "tonewalk/meter/background.hpp"
#include "tonewalk/meter/level_log.hpp"
#include "tonewalk/meter/record_grid.hpp"

namespace tonewalk {

/// Measures carrier and tone level record by record (docs/measurements.md, "Line meter"):
/// Hann-windowed correlations at the carrier and at the tone's two lines, at frequencies from one
/// smooth curve of the whole recording; noise from the lines between; 95 % intervals. Nothing
/// depends on how samples are cut.
///   look-ahead  10 s at most, as moments of each record's lines, never samples
///   memory      a record's window, its moments for 10 s, and the log
class line_meter final : public baseband_sink {
public:
    struct config {
        record_grid grid;
        double carrier_offset_hz = 0.0;  ///< what baseband 0 Hz is, Hz from the recording's centre
        std::optional<double> tone_hz;   ///< from the opening
        double width_hz = 0.0;           ///< flat width of the channel, > 0
        double noise_bandwidth_hz = 0.0; ///< of the channel's filter
        std::function<double(double)>
            response;              ///< channel's amplitude response at Hz from the carrier
        double dc_amplitude = 0.0; ///< of a line at the recording's centre, full scale = 1
        double image_ratio = 0.0;  ///< amplitude of the image over the signal's
        bool envelope_in_use =
            false;                   ///< an envelope is read beside: mark where noise suppresses it
        bool hold_frequency = false; ///< no curve: the lines stay where they are said to be
        background_lines background; ///< taken off every record in power
        std::optional<utc_time> start_utc;
    };
    explicit line_meter(
        const config&); ///< throws error{malformed} naming --window where it is too short
    ~line_meter() override;
    void begin_stretch(const baseband_stretch&) override;
    void add(const baseband_block&) override;
    void end_stretch() override;
    void finish() override;

    [[nodiscard]] bool has_records() const noexcept; ///< after finish()
    /// After finish(). Throws error{malformed} naming --window when no stretch held a record.
    [[nodiscard]] level_log take_result();

private:
    struct state;
    std::unique_ptr<state> state_;
};

} // namespace tonewalk
