// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <vector>

#include "level_interval.hpp"
#include "tonewalk/meter/background.hpp"
#include "tonewalk/meter/level_log.hpp"

namespace tonewalk {

/// What a record's intervals rest on, beside what its log entry holds.
struct record_basis {
    double independent = 0.0; ///< K
    double unknown_hz = 0.0;  ///< how far the frequency curve may be off
    double across_power =
        not_measured;   ///< (incidental phase x A)^2, where the record could be split
    bool split = false; ///< tone from the in-phase part alone
};

/// Fills in levels and their 95 % intervals once the whole log is known.
class level_intervals {
public:
    void add_null() { basis_.emplace_back(); }
    void set(std::size_t record, const record_basis& b) { basis_[record] = b; }

    struct common {
        double tone_response = 1.0; ///< Hann response at the tone's offset from where it was read
        double carrier_offset_hz = 0.0; ///< from the recording's centre
        double dc_amplitude = 0.0, image_ratio = 0.0;
        double envelope_noise_bandwidth_hz = 0.0; ///< 0: no envelope is read
        background_lines background;
    };
    void complete(level_log&, const common&);

private:
    struct bounds {
        double absolute = 0.0; // amplitude
        double relative = 0.0;
    };
    /// `background_power`: in either part of a split record.
    void correct_incidental_phase(level_log&, double background_power);
    void fill(level_log&, level_record&, const record_basis&, const common&);
    [[nodiscard]] interval_estimate level(const line_power&, double raw_ratio, int degrees,
                                          double unit, double line_snr, const bounds&,
                                          double independent);
    amplitude_limits limits_;
    std::vector<record_basis> basis_;
    double incidental_bound_ =
        0.0; // of the tone's amplitude, relative, in records that were not split
};

} // namespace tonewalk
