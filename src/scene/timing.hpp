// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <algorithm>
#include <cmath>
#include <cstddef>
#include <limits>
#include <vector>

#include "tonewalk/base/sample.hpp"
#include "tonewalk/scene/scene.hpp"

namespace tonewalk {

/// The first sample at or after a time; a billionth of a second's worth of decimal rounding is
/// forgiven.
inline sample_index sample_at(double time_s, double rate_hz) noexcept {
    constexpr double most = 4.0e18;
    const double index = std::ceil(time_s * rate_hz - 1e-6);
    return static_cast<sample_index>(std::clamp(index, -most, most));
}

/// The whole number of samples nearest to a duration.
inline sample_index samples_in(double duration_s, double rate_hz) noexcept {
    return static_cast<sample_index>(std::floor(duration_s * rate_hz + 0.5));
}

/// From one time to another, as positions; everything in between is on.
struct position_span {
    sample_index begin = std::numeric_limits<sample_index>::min();
    sample_index end = std::numeric_limits<sample_index>::max();
};
inline position_span span_between(double start_s, double stop_s, double delay_s, double rate_hz) {
    return {sample_at(start_s + delay_s, rate_hz), sample_at(stop_s + delay_s, rate_hz)};
}

/// The part of `count` samples from `first` that lies in a span, as offsets from `first`.
struct block_part {
    std::size_t begin = 0, end = 0;
};
inline block_part part_of_block(const position_span& on, sample_index first, std::size_t count) {
    const auto last = first + static_cast<sample_index>(count);
    const sample_index begin = std::clamp(on.begin, first, last);
    const sample_index end = std::clamp(on.end, begin, last);
    return {static_cast<std::size_t>(begin - first), static_cast<std::size_t>(end - first)};
}

/// Straight between its points, level beyond them. Fast where times ascend.
class scene_curve {
public:
    explicit scene_curve(std::vector<scene_point> points) : points_{std::move(points)} {}
    [[nodiscard]] bool empty() const noexcept { return points_.empty(); }
    [[nodiscard]] double at(double time_s) noexcept;

private:
    std::vector<scene_point> points_;
    std::size_t cursor_ = 0; // the last point looked at; any value is right, a near one is fast
};

inline double scene_curve::at(double time_s) noexcept {
    while (cursor_ > 0 && points_[cursor_].time_s > time_s)
        --cursor_;
    while (cursor_ + 1 < points_.size() && points_[cursor_ + 1].time_s <= time_s)
        ++cursor_;
    const scene_point& from = points_[cursor_];
    if (time_s <= from.time_s || cursor_ + 1 == points_.size())
        return from.value;
    const scene_point& to = points_[cursor_ + 1];
    return from.value +
           (to.value - from.value) * ((time_s - from.time_s) / (to.time_s - from.time_s));
}

} // namespace tonewalk
