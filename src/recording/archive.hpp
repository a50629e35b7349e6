// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <string>
#include <vector>

#include "input_file.hpp"

namespace tonewalk {

/// One member of a tar archive, as it lies in the archive.
struct archive_member {
    std::string name;
    byte_range range;
    std::string
        refusal; ///< why it is not to be used (a link, a climbing name ...); empty: it may be
};

/// The members in their order; nothing is unpacked, contents are skipped. Throws error{malformed}
/// for a broken archive, error{unsupported} for a compressed one.
[[nodiscard]] std::vector<archive_member> list_members(const input_file&);

/// The name of the compression that the file begins like ("gzip"); empty for others.
[[nodiscard]] std::string compression_of(const input_file&);

} // namespace tonewalk
