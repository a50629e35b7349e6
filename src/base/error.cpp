// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/base/error.hpp"

#include <cassert>

#include <fmt/core.h>

#include "tonewalk/base/text.hpp"

namespace tonewalk {
namespace {

std::string line(std::string_view what, std::string_view where, std::string_view mend) {
    // What was read from a file may be in it.
    return one_line(valid_utf8(fmt::format("{}{}{}{}{}", where, where.empty() ? "" : ": ", what,
                                           mend.empty() ? "" : "; ", mend)));
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
