// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <string>

#include "tonewalk/recording/stream.hpp"

namespace tonewalk {

/// SHA-512 of a recording's data as found and as its metadata states it, in lower-case hex.
struct data_hash {
    std::string found;
    std::string stated; ///< empty where nothing states one
    [[nodiscard]] bool differs() const noexcept { return !stated.empty() && stated != found; }
};

/// Reads all data of a recording that is a file; throws like open_recording. What `verify` in a
/// request does, for those who report a mismatch instead of refusing it.
[[nodiscard]] data_hash hash_data(const recording_request&);

} // namespace tonewalk
