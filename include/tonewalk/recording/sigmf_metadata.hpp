// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstdint>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "tonewalk/recording/sample_format.hpp"
#include "tonewalk/recording/sigmf_write.hpp"

namespace tonewalk {

/// One entry of "captures"; sample_start counts from core:offset, not from the file's first sample.
struct sigmf_capture : sigmf_segment {
    unsigned utc_decimals = 0;     ///< digits of the second that core:datetime states
    std::int64_t header_bytes = 0; ///< in the data file, just before this segment's samples
};

/// What a .sigmf-meta file says, as far as samples and their place in the data file go.
struct sigmf_metadata {
    std::string datatype;                ///< as written
    std::optional<sample_format> format; ///< empty where `datatype` is none of the grammar's
    std::optional<double> sample_rate_hz;
    unsigned lanes = 1;
    sample_index offset = 0; ///< index of the data file's first sample
    std::string sha512;      ///< lower-case hex; empty where none is stated
    std::string dataset;     ///< name of a non-conforming data file; empty: conforming
    bool metadata_only = false;
    std::int64_t trailing_bytes = 0;
    std::vector<sigmf_capture> captures; ///< ascending sample_start
};

/// Reads the text of a .sigmf-meta file (SigMF 1.2.5 and before); `name` is what error lines call
/// it. A pure function. Throws error{malformed}, naming the field and the mend, for text that is no
/// JSON object, a field missing, of the wrong type, out of range or given twice; error{unsupported}
/// for an extension that must be understood. Unknown fields and name spaces are ignored.
[[nodiscard]] sigmf_metadata parse_sigmf_metadata(std::string_view text, std::string_view name);

} // namespace tonewalk
