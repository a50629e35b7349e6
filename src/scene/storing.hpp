// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <cstdint>
#include <span>
#include <vector>

#include "tonewalk/base/random.hpp"
#include "tonewalk/base/sample.hpp"
#include "tonewalk/scene/scene.hpp"

namespace tonewalk {

/// The converter: samples to stored bytes, in order. Integers are scaled by 2^(bits-1), rounded
/// half to even and held at their own ends; unsigned ones are raised by 2^(bits-1).
class sample_store {
public:
    explicit sample_store(const scene&);
    /// bytes.size() == samples.size() x the sample's bytes; samples[0] is stored index `first`.
    void store(sample_index first, std::span<const cf64> samples, std::span<std::byte> bytes);

private:
    [[nodiscard]] std::uint64_t code(double component) noexcept;
    void put(std::uint64_t code, std::byte* to) const noexcept;
    void spoil(sample_index first, std::span<std::byte> bytes) const;

    sample_format format_;
    std::size_t component_bytes_;
    double scale_ = 1.0;       // integers: codes per full scale
    std::uint64_t middle_ = 0; // code of 0
    double noise_lsb_rms_;
    random_stream noise_;
    std::vector<scene_non_finite> non_finite_;
};

} // namespace tonewalk
