// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <array>
#include <cstdint>
#include <span>
#include <vector>

#include "tonewalk/base/sample.hpp"
#include "tonewalk/recording/stream.hpp"

namespace tonewalk {

/// Sums over one cell of samples, over finite samples, in full-scale units, after I and Q are
/// exchanged and the spectrum mirrored as asked. Of real samples i is the stored r itself (not the
/// converted 2r) and q is 0. Integers sum exactly.
struct cell_sums {
    double i = 0, q = 0, ii = 0, qq = 0, iq = 0; ///< sums of components and products
    double peak_power = 0;                       ///< largest |z|^2
    double peak_component = 0;                   ///< largest |i| or |q|
};

/// How often the outermost codes occur on one rail (positive, negative) of both components
/// together; codes that never occur are left out, so that a grid coarser than the codes (12 bits
/// left-aligned in 16, floats made from integers) looks like any other. Codes: integers as stored
/// (unsigned less 2^(bits-1), shifted to code_bits); floats by the bits of |x| above the lowest 8
/// (steps of 2^-15 or less). Zero is on neither rail.
struct rail_tally {
    std::array<std::int64_t, 4> codes{-1, -1, -1, -1}; ///< |code|, outermost first; -1: none seen
    std::array<std::uint64_t, 4> counts{};             ///< of each
    [[nodiscard]] std::int64_t outermost() const noexcept { return codes.front(); }
    void add(std::int64_t code, std::uint64_t count) noexcept; ///< code > 0
    void merge(const rail_tally&) noexcept;                    ///< exact, in any order
};

/// What one block says about the raw samples; merged in block order, so that neither block size nor
/// threads change a total.
struct raw_counts {
    std::vector<cell_sums> cells;
    rail_tally positive, negative;
    std::vector<sample_range>
        non_finite;           ///< stored index; one a cell, from the first in it to the last
    std::uint64_t zeroed = 0; ///< non-finite samples, exactly
    void clear() noexcept;
};

/// Turns stored frames into complex samples: the lane picked, integers scaled by 2^(bits-1)
/// (unsigned less 2^(bits-1) first), real samples r to 2r + 0j (the analytic signal's gain), I and
/// Q exchanged, spectrum mirrored (conjugate), non-finite samples to zero; last, the receiver's
/// image taken out: z - k conj(z) over 1 - |k|^2, k being the image's ratio to the signal. Counts
/// are those of the samples as recorded.
class sample_converter {
public:
    /// `image_ratio` below 1 in magnitude; 0: nothing is taken out. Real samples have no image.
    explicit sample_converter(const stream_facts&, cf64 image_ratio = {});
    /// out.size() samples from frames.size()/frame_bytes >= out.size() frames.
    void convert(std::span<const std::byte> frames, std::span<cf32> out) const noexcept;
    /// The same, filling `counts`: one cell_sums per `cell` samples (the last may be shorter);
    /// frames[0] is stored index `first`. counts.cells and counts.non_finite have room (reserved)
    /// for one entry a cell; both are appended to.
    void convert(std::span<const std::byte> frames, std::span<cf32> out, sample_index first,
                 std::size_t cell, raw_counts& counts) const noexcept;

private:
    void run(std::span<const std::byte> frames, std::span<cf32> out, sample_index first,
             std::size_t cell, raw_counts* counts) const noexcept;
    sample_format format_;
    std::size_t lanes_, lane_;
    unsigned code_shift_ = 0;
    bool swap_iq_, inverted_;
    cf64 image_ratio_;
};

} // namespace tonewalk
