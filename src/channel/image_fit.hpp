// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <optional>
#include <span>
#include <vector>

#include "line_spectrum.hpp"
#include "reference_lines.hpp"
#include "search_opening.hpp"
#include "tonewalk/channel/iq_balance.hpp"

namespace tonewalk {

/// Finds the receiver's image ratio k from strong lines and what stands at their mirror places: an
/// image is k times the conjugate of its line in every segment, through fades and modulation, and k
/// is the same for all lines. A signal of its own at a mirror place turns against the line, or
/// disagrees with the other lines; a scatter beyond the noise is taken into the uncertainty whole.
class image_fit {
public:
    /// Adds one look with its survey; real samples add nothing.
    void add(const looked_at&, const line_spectrum& survey);
    /// Nothing where no line suited (reference_lines).
    [[nodiscard]] std::optional<iq_balance> result() const;

    /// An image ratio seen once, and how sure: 1 / variance of both components together.
    struct observation {
        cf64 ratio;
        double weight = 0.0;
    };

private:
    /// One line over one look.
    struct group {
        cf64 ratio;
        double variance = 0.0;
        bool steady = false; ///< its segments agree within the noise
    };
    void add_lines(const looked_at&, const line_spectrum& survey, const reference_lines&);
    void add_group(std::span<const observation> of_line);
    [[nodiscard]] std::vector<observation> trusted() const;
    std::vector<group> groups_;
};

} // namespace tonewalk
