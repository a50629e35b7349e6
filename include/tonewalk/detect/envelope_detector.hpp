// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <optional>

#include "tonewalk/detect/detector.hpp"
#include "tonewalk/detect/fir_stage.hpp"

namespace tonewalk {

/// Magnitude of the samples. The magnitude of a modulated carrier with noise reaches beyond the
/// channel's band; where the rate is below 4 times the width it is taken at a whole multiple of the
/// rate, then filtered and decimated back, flat over the lesser of half the width and 0.45 of the
/// rate.
class envelope_detector final : public detector {
public:
    struct config {
        double rate_hz = 0.0;  ///< > 0
        double width_hz = 0.0; ///< 0 < width <= rate
    };
    explicit envelope_detector(const config&); ///< throws error{bad_request}
    void begin() override;
    void add(std::span<const cf32> in, std::vector<float>& out) override;
    void end(std::vector<float>& out) override;
    [[nodiscard]] std::size_t lag_samples() const noexcept override;
    [[nodiscard]] std::size_t spread_samples() const noexcept override { return lag_samples(); }
    [[nodiscard]] std::size_t factor() const noexcept { return factor_; } ///< 1: no interpolation

private:
    void magnitudes();

    std::size_t factor_;
    std::optional<fir_stage<cf32>> interpolator_; // none when factor_ is 1
    std::optional<fir_stage<float>> decimator_;
    std::vector<cf32> dense_;      // scratch
    std::vector<float> magnitude_; // scratch
};

} // namespace tonewalk
