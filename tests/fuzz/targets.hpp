// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <span>
#include <stdexcept>
#include <string>
#include <string_view>

#include "tonewalk/base/error.hpp"

namespace tonewalk::fuzz {

using input = std::span<const std::byte>;

/// Each reads any bytes as the program reads a file of that kind. True: they were accepted; false:
/// refused with a tonewalk::error. Throws std::logic_error when what came out breaks a promise.
bool metadata(input);
bool archive(input);
bool container(input);
bool scene_text(input);

inline void promise(bool kept, const char* what) {
    if (!kept)
        throw std::logic_error{what};
}

inline std::string_view text_of(input bytes) {
    return {reinterpret_cast<const char*>(bytes.data()), bytes.size()};
}

/// Whether `read` returns; an error that it throws must fit in one line.
template <typename Read>
bool accepted(Read&& read) {
    try {
        read();
        return true;
    } catch (const error& refusal) {
        for (const char letter : std::string_view{refusal.what()})
            promise(static_cast<unsigned char>(letter) >= 0x20 && letter != 0x7F,
                    "an error line holds a control character");
        return false;
    }
}

} // namespace tonewalk::fuzz
