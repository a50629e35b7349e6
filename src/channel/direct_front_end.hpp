// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstdint>
#include <vector>

#include "tonewalk/channel/front_end.hpp"

namespace tonewalk {

/// The plain front end: each channel's own taps over every sample. Scalar; the reference for faster
/// forms.
class direct_front_end final : public front_end {
public:
    direct_front_end(const stream_facts&, std::span<const channel_plan>, cf64 image_ratio);
    [[nodiscard]] std::size_t lead() const noexcept override { return low_pass_.size() - 1; }
    [[nodiscard]] std::size_t cell() const noexcept override { return cell_; }
    [[nodiscard]] std::size_t decimation() const noexcept override { return decimation_; }
    [[nodiscard]] double output_rate_hz() const noexcept override { return output_rate_hz_; }
    [[nodiscard]] std::size_t delay_outputs() const noexcept override { return delay_outputs_; }
    [[nodiscard]] std::size_t outputs(const raw_block&) const noexcept override;
    [[nodiscard]] bool holds(std::size_t channel, std::uint32_t stretch) const noexcept override;
    [[nodiscard]] double response(std::size_t channel, double hz) const noexcept override;
    [[nodiscard]] std::unique_ptr<workspace>
    make_workspace(std::size_t block_samples) const override;
    void process(const raw_block&, workspace&, raw_counts&,
                 std::span<const std::span<cf32>>) const noexcept override;

private:
    /// Taps moved to one offset, newest input last, padded at the front to whole lanes; and the
    /// mixer's step.
    struct tuning {
        double offset_hz = 0.0;
        std::uint64_t step = 0;
        std::vector<float> real, imaginary;
    };
    struct scratch;
    [[nodiscard]] std::size_t tune(double offset_hz);
    void load(const raw_block&, scratch&, raw_counts&) const noexcept;
    void filter(const tuning&, const scratch&, sample_index first_stored,
                std::span<cf32>) const noexcept;

    sample_converter converter_;
    std::size_t frame_bytes_;
    double input_rate_hz_, output_rate_hz_ = 0.0;
    std::size_t decimation_ = 1, cell_ = 1, delay_outputs_ = 0, padded_taps_ = 0;
    std::vector<double> low_pass_;
    std::vector<tuning> tunings_;             // each distinct offset once
    std::vector<std::vector<int>> tuning_of_; // [channel][stretch]; -1: not held
};

} // namespace tonewalk
