// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "tonewalk/base/sample.hpp"
#include "tonewalk/base/time.hpp"
#include "tonewalk/recording/sample_format.hpp"

namespace tonewalk {

/// One segment: from `sample_start` to the next segment's.
struct sigmf_segment {
    sample_index sample_start = 0;            ///< index among the stored samples
    std::optional<sample_index> global_index; ///< with lost samples counted; absent: sample_start
    std::optional<double> centre_hz;          ///< within ±1e12
    std::optional<utc_time> start_utc;
};

struct sigmf_frequency_span {
    double low_hz = 0.0, high_hz = 0.0;
};

/// A remark on samples [sample_start, sample_start + sample_count).
struct sigmf_annotation {
    sample_index sample_start = 0;
    std::optional<sample_index> sample_count; ///< absent: up to the next annotation
    std::optional<sigmf_frequency_span> span;
    std::string label, comment; ///< empty: left out
};

/// All that is written of a recording; empty texts and lists are left out.
struct sigmf_document {
    sample_format format;
    double sample_rate_hz = 0.0; ///< 1 to 1e12
    unsigned lanes = 1;          ///< interleaved streams
    std::string author, description, recorder, hardware, licence_uri;
    std::string sha512;                        ///< of the whole data file, 128 hex digits
    std::vector<sigmf_segment> segments{{}};   ///< ascending sample_start; empty: one segment at 0
    std::vector<sigmf_annotation> annotations; ///< ascending sample_start
};

/// The text of the .sigmf-meta file, SigMF 1.2.5, indented, ending in a newline. Bytes of texts
/// that are no UTF-8 are replaced.
[[nodiscard]] std::string sigmf_text(const sigmf_document&);

} // namespace tonewalk
