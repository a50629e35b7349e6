// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <span>

#include "tonewalk/base/estimate.hpp"

namespace tonewalk {

/// One record's lines in phase with its carrier, full scale = 1.
struct modulation_lines {
    float carrier = 0.0F; ///< amplitude
    float tone = 0.0F;    ///< amplitude of the tone in the envelope
    float second = 0.0F;  ///< of its second harmonic; positive: crests sharper, troughs flatter
    float noise = 0.0F;   ///< power of a line that should be empty
};

/// A quantity and its standard error.
struct with_error {
    double value = 0.0, error = 0.0;
};

/// Bend a of a curve e (1 + a e^2) that the envelope e went through, told in two ways: by the
/// second harmonic, which grows by the cube of the carrier, and by the tone's share of the carrier.
/// Standard errors are the larger of what the noise explains and what leaving out tenths of the
/// records shows.
struct product_growth {
    with_error from_products, from_depth; ///< per full scale^2; negative: compression
    double depth = 0.0;                   ///< of weak signals, 1 = 100 %
};
/// `line_noise`: power of the noise of one line. Records in order of time, 10 at least, carriers
/// not all alike.
[[nodiscard]] product_growth fit_growth(std::span<const modulation_lines>, double line_noise);

/// Whether the depth falls as well, and by what the products demand: anything from a hard limit to
/// a smooth bend, within 3 standard errors.
[[nodiscard]] bool depth_agrees(const product_growth&) noexcept;

/// What the highest crest of the records lost to a curve r / sqrt(1 + r^2/s^2): the one which,
/// undone, leaves no growth of products. 12 dB at most; negative where products fall.
[[nodiscard]] double crest_loss_db(std::span<const modulation_lines>, const product_growth&);

} // namespace tonewalk
