// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <functional>
#include <span>
#include <string>
#include <string_view>

#include "tonewalk/scene/scene.hpp"

namespace tonewalk {

/// Times of the truth's series: 0, truth_every_s, ... up to the last sample.
[[nodiscard]] std::size_t truth_points(const scene&);

/// Writes the truth of a scene with the result keys of look, levels and depth. `controlled_gain_db`
/// is what the gain control did at each truth point; empty without one.
void write_truth(const scene&, std::string_view sha512, std::span<const double> controlled_gain_db,
                 const std::function<void(std::string_view)>& write);

} // namespace tonewalk
