// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstdint>

#include "tonewalk/base/note.hpp"
#include "tonewalk/base/sheet.hpp"
#include "tonewalk/recording/convert.hpp"
#include "tonewalk/recording/stream.hpp"

namespace tonewalk {

/// What the raw samples themselves say (thresholds in docs/results.md).
struct raw_result {
    double rms_dbfs = not_measured, peak_dbfs = not_measured, peak_component_dbfs = not_measured;
    double headroom_db = not_measured; ///< from the largest |I| or |Q| up to full scale
    double dc_dbfs = not_measured;     ///< of the mean; of real samples too as they are stored
    std::uint64_t clipped_samples = 0; ///< components that stand on a clipped rail's outermost code
    bool clipping_judged = false;      ///< false: fewer than 64 codes, or too coarse a grid to tell
    sample_index samples = 0;
    note_set doubts; ///< clipped, non-finite-samples
};
[[nodiscard]] sheet describe(const raw_result&);

/// Adds up what the front end counts, block by block in order; `facts` outlives it.
class raw_watch {
public:
    explicit raw_watch(const stream_facts&);
    void add(const raw_counts&, std::size_t samples);
    [[nodiscard]] raw_result result() const;

private:
    void judge_levels(raw_result&) const;
    void judge_clipping(raw_result&) const;
    const stream_facts* facts_;
    cell_sums total_;
    rail_tally positive_, negative_;
    std::uint64_t samples_ = 0, non_finite_ = 0;
};

} // namespace tonewalk
