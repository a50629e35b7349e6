// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <vector>

#include "line_spectrum.hpp"

namespace tonewalk {

/// Which lines of a survey have a mirror place about 0 Hz that shows their image and nothing else:
/// 8 bins or more from 0 Hz and the band's edges, 20 dB over the noise at the mirror place, 10 dB
/// over what stands there, which is neither another line's lobe nor a sideband.
class reference_lines {
public:
    explicit reference_lines(const line_spectrum& survey); ///< outlives this
    /// At most 8 bins, strongest first.
    [[nodiscard]] const std::vector<std::size_t>& chosen() const noexcept { return chosen_; }
    /// The strongest line of all is among them, or there is no line.
    [[nodiscard]] bool has_strongest() const noexcept;
    [[nodiscard]] std::size_t mirror(std::size_t k) const noexcept { // the middle bin is 0 Hz
        return 2 * (survey_.size() / 2) - k;
    }

private:
    [[nodiscard]] bool is_strong(std::size_t k) const;
    [[nodiscard]] bool is_alone(std::size_t place) const;
    [[nodiscard]] bool is_sideband(std::size_t place) const;
    [[nodiscard]] bool has_partner(std::size_t place, std::size_t carrier) const;
    [[nodiscard]] bool is_image(std::size_t k) const;

    const line_spectrum& survey_;
    std::vector<std::size_t> lines_, chosen_; // strongest first
};

} // namespace tonewalk
