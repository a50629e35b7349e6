// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <stdexcept>
#include <string>
#include <string_view>

namespace tonewalk {

/// Why a run cannot go on. Exit statuses: bad_request 2; unreadable, malformed, unsupported 3;
/// unwritable 4.
enum class fault { bad_request, unreadable, malformed, unsupported, unwritable };

/// A failure that the user can mend. what() is one line: "WHERE: WHAT; MEND".
class error : public std::runtime_error {
public:
    error(fault kind, std::string_view what, std::string_view where, std::string_view mend);
    [[nodiscard]] fault kind() const noexcept { return kind_; }
    [[nodiscard]] int exit_status() const noexcept;

private:
    fault kind_;
};

} // namespace tonewalk
