// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

namespace tonewalk {

/// Indicated over true depth of an envelope detector, small depth, at carrier-to-noise power ratio
/// `carrier_to_noise` in the band before it: A r'(A) / r(A) with the Rician mean r
/// (S. O. Rice, "Mathematical Analysis of Random Noise", Bell System Technical Journal 23/24,
/// 1944/45, from memory; closed form derived anew).
[[nodiscard]] double envelope_depth_factor(double carrier_to_noise) noexcept;

} // namespace tonewalk
