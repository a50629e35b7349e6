// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <optional>
#include <string>
#include <string_view>

namespace tonewalk {

enum class sample_type { f32, f64, i32, i16, u32, u16, i8, u8 };

/// How one sample of one lane is stored: SigMF's core:datatype grammar, by grammar and not by its
/// loose schema pattern (ci16_le, cu8, rf64_be ...).
struct sample_format {
    sample_type type = sample_type::i16;
    bool is_complex = true;
    bool big_endian = false;

    [[nodiscard]] std::size_t component_bytes() const noexcept;
    [[nodiscard]] std::size_t sample_bytes() const noexcept; ///< of one lane: one or two components
    [[nodiscard]] std::string name() const;                  ///< "ci16_le"
    [[nodiscard]] bool is_float() const noexcept;
    friend bool operator==(const sample_format&, const sample_format&) = default;
};
[[nodiscard]] std::optional<sample_format> parse_sample_format(std::string_view text) noexcept;

} // namespace tonewalk
