// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <optional>
#include <span>
#include <utility>

#include "tonewalk/maths/parabola_fit.hpp"
#include "tonewalk/reading/extrema.hpp"

namespace tonewalk {

/// A null narrower than this many windows is filled by them: its depth is a bound.
inline constexpr double least_null_windows = 6.0;

/// One record as the walk sees it; undetected records have amplitude 0.
struct log_step {
    const level_record* record = nullptr;
    double amplitude = 0.0, power = 0.0, sigma = 0.0;
    bool detected = false;
};

/// Time, level and width of the turns of one stretch, from parabolas in power. Looks at the steps.
class extremum_placer {
public:
    extremum_placer(std::span<const log_step> steps, const level_log&, quantity);
    /// Steps that a turn may be placed by: no further than its neighbours.
    struct reach {
        std::size_t first = 0, last = 0;
    };
    [[nodiscard]] extremum peak_at(std::size_t place, const reach&) const;
    [[nodiscard]] extremum null_at(std::size_t place, const reach&) const;

private:
    [[nodiscard]] std::pair<std::size_t, std::size_t> undetected_about(std::size_t place,
                                                                       const reach&) const;
    [[nodiscard]] std::pair<std::size_t, std::size_t> run_about(std::size_t place, double limit,
                                                                bool above, const reach&) const;
    [[nodiscard]] std::optional<parabola_vertex> vertex(std::size_t first, std::size_t last) const;
    [[nodiscard]] double shape_error(const parabola_vertex&, std::size_t first,
                                     std::size_t last) const noexcept;
    [[nodiscard]] double width_s(std::size_t place, double level) const;
    [[nodiscard]] const interval_estimate& level_near(double time_s) const noexcept;
    [[nodiscard]] interval_estimate level_of_fit(const parabola_vertex&, std::size_t first,
                                                 std::size_t last) const;
    void take_time(extremum&, const std::optional<parabola_vertex>&, std::size_t first,
                   std::size_t last, std::size_t place) const;

    std::span<const log_step> steps_;
    const level_log* log_;
    double window_s_;
    double overlap_;     // variance of a mean over that of as many independent records
    double swing_ = 0.0; // of power, highest to lowest
    double highest_ = 0.0;
    quantity which_;
};

} // namespace tonewalk
