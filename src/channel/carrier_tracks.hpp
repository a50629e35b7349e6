// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <vector>

#include "tonewalk/channel/signal_search.hpp"

namespace tonewalk {

/// Carriers through several looks at a recording: what stands within 100 Hz of where a carrier last
/// stood is that carrier.
class carrier_tracks {
public:
    struct track {
        found_carrier carrier; ///< as it showed in `look`
        std::size_t look = 0;  ///< where it was strongest with a tone, else strongest
        double last_hz = 0.0;  ///< where it was last seen
        std::size_t last_look = 0;
    };
    void add(const std::vector<found_carrier>&, std::size_t look); ///< looks in order
    [[nodiscard]] std::vector<track> strongest_first() const;

private:
    [[nodiscard]] track* nearest(double offset_hz, std::size_t look);
    std::vector<track> tracks_;
};

} // namespace tonewalk
