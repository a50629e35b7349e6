// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <span>
#include <vector>

#include "tonewalk/detect/narrow_low_pass.hpp"

namespace tonewalk {

/// Takes the carrier's share, its fading below half the low edge included, off detected audio: a
/// linear-phase high-pass, flat to 0.001 dB from the low edge on. Delay removed, as many outputs as
/// inputs; edges and blocks as in fir_stage.
class carrier_remover {
public:
    struct config {
        double rate_hz = 0.0;
        double low_edge_hz = 50.0; ///< 5 <= low edge <= rate/2
    };
    explicit carrier_remover(const config&); ///< throws error{bad_request}
    void begin() noexcept;
    void add(std::span<const float> in, std::vector<float>& out); ///< appends
    void end(std::vector<float>& out);
    [[nodiscard]] std::size_t reach_samples() const noexcept { return narrow_.reach_samples(); }

private:
    void subtract(std::vector<float>& out);

    narrow_low_pass<float> narrow_;
    std::vector<float> pending_; // state: inputs that wait for their mean
    std::vector<float> slow_;    // scratch
};

} // namespace tonewalk
