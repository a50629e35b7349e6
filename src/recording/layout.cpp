// SPDX-License-Identifier: GPL-3.0-or-later
// How captures become stretches.
#include <algorithm>
#include <cmath>

#include <fmt/format.h>

#include "stated.hpp"
#include "tonewalk/base/error.hpp"

namespace tonewalk {
namespace {

// Captures as found, one at the first sample put in front where none stands there.
std::vector<sigmf_capture> complete_captures(const sigmf_metadata& metadata) {
    std::vector<sigmf_capture> captures = metadata.captures;
    if (captures.empty() || captures.front().sample_start > metadata.offset) {
        sigmf_capture first;
        first.sample_start = metadata.offset;
        captures.insert(captures.begin(), first);
    }
    return captures;
}

// Times are as good as the decimals that the recording's times are written with; whole seconds are
// taken to be meant exactly.
double time_resolution_s(const std::vector<sigmf_capture>& captures) {
    unsigned decimals = 0;
    for (const auto& capture : captures)
        decimals = std::max(decimals, capture.utc_decimals);
    return decimals == 0 ? 0.0 : std::pow(10.0, -static_cast<double>(decimals));
}

double seconds_between(utc_time from, utc_time until) {
    return std::chrono::duration<double>(until - from).count();
}

class segment_walker {
public:
    segment_walker(const sigmf_metadata& metadata, std::int64_t data_bytes, std::size_t frame_bytes,
                   double rate_hz, const std::string& name)
        : captures_{complete_captures(metadata)}, offset_{metadata.offset},
          inserted_{captures_.size() - metadata.captures.size()}, name_{name},
          data_bytes_{data_bytes - metadata.trailing_bytes},
          frame_bytes_{static_cast<std::int64_t>(frame_bytes)}, rate_hz_{rate_hz},
          resolution_samples_{time_resolution_s(captures_) * rate_hz} {
        if (data_bytes_ < 0)
            throw error{fault::malformed, "is more than the data file holds",
                        fmt::format("{}, global, core:trailing_bytes", name_),
                        "correct the metadata, or copy the data again"};
    }

    data_layout walk() {
        for (std::size_t k = 0; k < captures_.size() && holds(k); ++k)
            add(k);
        return std::move(layout_);
    }

private:
    sample_index start(std::size_t k) const { return captures_[k].sample_start - offset_; }
    // Frames before the data's end, the headers met so far left out.
    sample_index frames_held() const { return (data_bytes_ - header_bytes_) / frame_bytes_; }

    // Whether segment k begins inside the data; counts its header if so.
    bool holds(std::size_t k) {
        const std::int64_t header = captures_[k].header_bytes;
        if (header > data_bytes_ - header_bytes_)
            return false;
        header_bytes_ += header;
        if (k == 0 || start(k) < frames_held())
            return true;
        header_bytes_ -= header;
        return false;
    }

    void add(std::size_t k) {
        const sample_index first = start(k);
        const bool bounded = k + 1 < captures_.size() && start(k + 1) < frames_held();
        const sample_index end = bounded ? start(k + 1) : frames_held();
        if (!bounded)
            layout_.odd_bytes = data_bytes_ - header_bytes_ - end * frame_bytes_;
        if (k > 0)
            position_ += step_to(k);
        if (captures_[k].start_utc && !layout_.start_utc)
            layout_.start_utc =
                moved_by(*captures_[k].start_utc, -static_cast<double>(position_) / rate_hz_);
        const stretch_facts here{first, end - first, position_, captures_[k].centre_hz};
        if (*here.count > 0 && !joined(here, captures_[k].header_bytes))
            layout_.stretches.push_back({here, header_bytes_});
    }

    // Samples from the start of the segment before to that of segment k, lost ones included.
    sample_index step_to(std::size_t k) const {
        const sigmf_capture& before = captures_[k - 1];
        const sigmf_capture& here = captures_[k];
        const sample_index stored = here.sample_start - before.sample_start;
        if (here.global_index) {
            const sample_index step =
                *here.global_index - before.global_index.value_or(before.sample_start);
            if (step < stored)
                throw error{
                    fault::malformed, "lies before the end of the entry before",
                    fmt::format("{}, captures[{}], core:global_index", name_, k - inserted_),
                    "correct the metadata"};
            return step;
        }
        if (!here.start_utc || !before.start_utc)
            return stored;
        const double lost = seconds_between(*before.start_utc, *here.start_utc) * rate_hz_ -
                            static_cast<double>(stored);
        const bool a_gap = lost >= std::max(1.0 - 1e-6, resolution_samples_) && lost < 9e15;
        return stored + (a_gap ? std::llround(lost) : 0);
    }

    bool joined(const stretch_facts& here, std::int64_t header) {
        if (header != 0 || layout_.stretches.empty())
            return false;
        stretch_facts& last = layout_.stretches.back().facts;
        if (last.position + *last.count != here.position || last.centre_hz != here.centre_hz)
            return false;
        last.count = *last.count + *here.count;
        return true;
    }

    std::vector<sigmf_capture> captures_;
    sample_index offset_;
    std::size_t inserted_; // captures that are not in the file
    const std::string& name_;
    std::int64_t data_bytes_, frame_bytes_, header_bytes_ = 0;
    double rate_hz_, resolution_samples_;
    sample_index position_ = 0;
    data_layout layout_;
};

} // namespace

data_layout lay_out_frames(std::int64_t data_bytes, std::size_t frame_bytes) {
    const auto frame = static_cast<std::int64_t>(frame_bytes);
    data_layout layout;
    layout.odd_bytes = data_bytes % frame;
    if (data_bytes >= frame)
        layout.stretches.push_back({{0, data_bytes / frame, 0, std::nullopt}, 0});
    return layout;
}

data_layout lay_out_segments(const sigmf_metadata& metadata, std::int64_t data_bytes,
                             std::size_t frame_bytes, double rate_hz, const std::string& name) {
    return segment_walker{metadata, data_bytes, frame_bytes, rate_hz, name}.walk();
}

} // namespace tonewalk
