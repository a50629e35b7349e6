// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <bit>
#include <cstddef>
#include <cstdint>
#include <cstring>
#include <type_traits>

#include "tonewalk/recording/sample_format.hpp"

namespace tonewalk {

/// Calls `use` with a value of the type that stores a component.
template <class Use>
decltype(auto) with_stored_type(sample_type type, Use&& use) {
    switch (type) {
    case sample_type::f32:
        return use(float{});
    case sample_type::f64:
        return use(double{});
    case sample_type::i32:
        return use(std::int32_t{});
    case sample_type::i16:
        return use(std::int16_t{});
    case sample_type::u32:
        return use(std::uint32_t{});
    case sample_type::u16:
        return use(std::uint16_t{});
    case sample_type::i8:
        return use(std::int8_t{});
    case sample_type::u8:
        break;
    }
    return use(std::uint8_t{});
}

inline std::uint8_t byte_reversed(std::uint8_t bits) noexcept {
    return bits;
}
inline std::uint16_t byte_reversed(std::uint16_t bits) noexcept {
    return __builtin_bswap16(bits);
}
inline std::uint32_t byte_reversed(std::uint32_t bits) noexcept {
    return __builtin_bswap32(bits);
}
inline std::uint64_t byte_reversed(std::uint64_t bits) noexcept {
    return __builtin_bswap64(bits);
}

template <class Stored>
using bits_of = std::conditional_t<
    sizeof(Stored) == 8, std::uint64_t,
    std::conditional_t<sizeof(Stored) == 4, std::uint32_t,
                       std::conditional_t<sizeof(Stored) == 2, std::uint16_t, std::uint8_t>>>;

/// One component as stored, at any alignment.
template <class Stored>
Stored load(const std::byte* at, bool reversed) noexcept {
    bits_of<Stored> bits;
    std::memcpy(&bits, at, sizeof bits);
    return std::bit_cast<Stored>(reversed ? byte_reversed(bits) : bits);
}

/// What is computed with: floats as they are, integers about zero.
template <class Stored>
auto centred(Stored stored) noexcept {
    if constexpr (std::is_floating_point_v<Stored>) {
        return stored;
    } else {
        constexpr std::int64_t middle =
            std::is_signed_v<Stored> ? 0 : std::int64_t{1} << (8 * sizeof(Stored) - 1);
        return static_cast<std::int32_t>(static_cast<std::int64_t>(stored) - middle);
    }
}

} // namespace tonewalk
