// SPDX-License-Identifier: GPL-3.0-or-later
// The text of a .sigmf-meta file, and where it says that samples lie.
#include <cmath>

#include "stated.hpp"
#include "targets.hpp"
#include "tonewalk/recording/sigmf_metadata.hpp"
#include "walk.hpp"

namespace tonewalk::fuzz {
namespace {

void check_fields(const sigmf_metadata& read) {
    promise(read.lanes >= 1 && read.lanes <= 1024, "lanes out of range");
    promise(read.offset >= 0 && read.trailing_bytes >= 0, "a negative count");
    promise(read.dataset.find('/') == std::string::npos, "a data set in another folder");
    promise(!read.sample_rate_hz || std::isfinite(*read.sample_rate_hz), "a rate without end");
    sample_index before = read.offset;
    for (const sigmf_capture& capture : read.captures) {
        promise(capture.sample_start >= before, "captures out of order");
        promise(capture.header_bytes >= 0, "a negative header");
        promise(!capture.centre_hz || std::isfinite(*capture.centre_hz), "a centre without end");
        before = capture.sample_start;
    }
}

void check_layout(const data_layout& layout, std::int64_t data_bytes, std::int64_t frame_bytes) {
    promise(layout.odd_bytes >= 0, "a tail of less than nothing");
    stretch_order order;
    for (const auto& [facts, header_bytes] : layout.stretches) {
        order.add(facts);
        promise(header_bytes >= 0 && header_bytes + order.stored() * frame_bytes <= data_bytes,
                "a stretch that leaves the data");
    }
}

} // namespace

bool metadata(input bytes) {
    return accepted([&] {
        const sigmf_metadata read = parse_sigmf_metadata(text_of(bytes), "input");
        check_fields(read);
        const std::size_t frame = read.format.value_or(sample_format{}).sample_bytes() * read.lanes;
        const double rate_hz = read.sample_rate_hz.value_or(48000.0);
        for (const std::int64_t data_bytes : {0, 1, 4096, 1 << 20})
            (void)accepted([&] {
                check_layout(lay_out_segments(read, data_bytes, frame, rate_hz, "input"),
                             data_bytes, static_cast<std::int64_t>(frame));
            });
    });
}

} // namespace tonewalk::fuzz
