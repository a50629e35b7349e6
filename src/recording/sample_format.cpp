// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/recording/sample_format.hpp"

#include <array>

#include <fmt/format.h>

namespace tonewalk {
namespace {

struct type_facts {
    std::string_view name;
    std::size_t bytes;
};
constexpr std::array<type_facts, 8> types{
    {{"f32", 4}, {"f64", 8}, {"i32", 4}, {"i16", 2}, {"u32", 4}, {"u16", 2}, {"i8", 1}, {"u8", 1}}};

const type_facts& facts_of(sample_type type) noexcept {
    return types[static_cast<std::size_t>(type)];
}

} // namespace

std::size_t sample_format::component_bytes() const noexcept {
    return facts_of(type).bytes;
}

std::size_t sample_format::sample_bytes() const noexcept {
    return component_bytes() * (is_complex ? 2 : 1);
}

std::string sample_format::name() const {
    const std::string_view order = component_bytes() == 1 ? "" : big_endian ? "_be" : "_le";
    return fmt::format("{}{}{}", is_complex ? 'c' : 'r', facts_of(type).name, order);
}

bool sample_format::is_float() const noexcept {
    return type == sample_type::f32 || type == sample_type::f64;
}

std::optional<sample_format> parse_sample_format(std::string_view text) noexcept {
    if (text.empty() || (text.front() != 'c' && text.front() != 'r'))
        return std::nullopt;
    const bool is_complex = text.front() == 'c';
    text.remove_prefix(1);
    for (std::size_t k = 0; k < types.size(); ++k) {
        if (text.substr(0, types[k].name.size()) != types[k].name)
            continue;
        const std::string_view order = text.substr(types[k].name.size());
        const bool one_byte = types[k].bytes == 1;
        if (one_byte ? !order.empty() : order != "_le" && order != "_be")
            return std::nullopt;
        return sample_format{static_cast<sample_type>(k), is_complex, order == "_be"};
    }
    return std::nullopt;
}

} // namespace tonewalk
