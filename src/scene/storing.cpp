// SPDX-License-Identifier: GPL-3.0-or-later
#include "storing.hpp"

#include <algorithm>
#include <bit>
#include <limits>

#include "exact.hpp"
#include "timing.hpp"

namespace tonewalk {
namespace {

constexpr std::uint64_t converter_noise_stream = 2;

bool is_unsigned(sample_type type) noexcept {
    return type == sample_type::u32 || type == sample_type::u16 || type == sample_type::u8;
}

double value_of(scene_non_finite::kind kind) noexcept {
    switch (kind) {
    case scene_non_finite::kind::infinity:
        return std::numeric_limits<double>::infinity();
    case scene_non_finite::kind::minus_infinity:
        return -std::numeric_limits<double>::infinity();
    case scene_non_finite::kind::nan:
        break;
    }
    return std::numeric_limits<double>::quiet_NaN();
}

std::uint64_t float_code(sample_type type, double value) noexcept {
    return type == sample_type::f32 ? std::bit_cast<std::uint32_t>(static_cast<float>(value))
                                    : std::bit_cast<std::uint64_t>(value);
}

} // namespace

sample_store::sample_store(const scene& whole)
    : format_{whole.format}, component_bytes_{whole.format.component_bytes()},
      noise_lsb_rms_{whole.receiver.noise_lsb_rms}, noise_{whole.seed, converter_noise_stream},
      non_finite_{whole.receiver.non_finite} {
    if (format_.is_float())
        return;
    const std::uint64_t half = std::uint64_t{1} << (8U * component_bytes_ - 1U);
    scale_ = static_cast<double>(half);
    middle_ = is_unsigned(format_.type) ? half : 0;
}

std::uint64_t sample_store::code(double component) noexcept {
    if (format_.is_float())
        return float_code(format_.type, component);
    double level = component * scale_;
    if (noise_lsb_rms_ > 0.0)
        level += noise_lsb_rms_ * noise_.gaussian();
    const double rounded = round_half_even(std::clamp(level, -scale_, scale_ - 1.0));
    return static_cast<std::uint64_t>(static_cast<std::int64_t>(rounded)) + middle_;
}

void sample_store::put(std::uint64_t code, std::byte* to) const noexcept {
    for (std::size_t k = 0; k < component_bytes_; ++k) {
        const std::size_t place = format_.big_endian ? component_bytes_ - 1 - k : k;
        to[k] = static_cast<std::byte>((code >> (8U * place)) & 0xffU);
    }
}

void sample_store::store(sample_index first, std::span<const cf64> samples,
                         std::span<std::byte> bytes) {
    std::byte* to = bytes.data();
    for (const cf64& z : samples) {
        put(code(z.real()), to);
        to += component_bytes_;
        if (!format_.is_complex)
            continue;
        put(code(z.imag()), to);
        to += component_bytes_;
    }
    if (!non_finite_.empty())
        spoil(first, bytes);
}

void sample_store::spoil(sample_index first, std::span<std::byte> bytes) const {
    const std::size_t sample_bytes = format_.sample_bytes();
    for (const scene_non_finite& run : non_finite_) {
        const std::uint64_t bad = float_code(format_.type, value_of(run.value));
        const block_part hit =
            part_of_block({run.first, run.first + run.count}, first, bytes.size() / sample_bytes);
        for (std::size_t at = hit.begin * sample_bytes; at < hit.end * sample_bytes;
             at += component_bytes_)
            put(bad, &bytes[at]);
    }
}

} // namespace tonewalk
