// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/base/error.hpp"

#include <cassert>

#include <fmt/format.h>

namespace tonewalk {
namespace {

// Whatever was read from a file and is quoted, it stays one line and leaves the terminal alone.
std::string line(std::string_view what, std::string_view where, std::string_view mend) {
    std::string text = fmt::format("{}{}{}{}{}", where, where.empty() ? "" : ": ", what,
                                   mend.empty() ? "" : "; ", mend);
    for (char& letter : text)
        if (static_cast<unsigned char>(letter) < 0x20 || letter == 0x7F)
            letter = '?';
    return text;
}

} // namespace

error::error(fault kind, std::string_view what, std::string_view where, std::string_view mend)
    : std::runtime_error{line(what, where, mend)}, kind_{kind} {}

int error::exit_status() const noexcept {
    switch (kind_) {
    case fault::bad_request:
        return 2;
    case fault::unreadable:
    case fault::malformed:
    case fault::unsupported:
        return 3;
    case fault::unwritable:
        return 4;
    }
    assert(false);
    return 5;
}

} // namespace tonewalk
