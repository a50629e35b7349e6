// SPDX-License-Identifier: GPL-3.0-or-later
// A container of any kind: its chunks, then what is read of it.
#include "container.hpp"

#include "container_chunks.hpp"
#include "memory_file.hpp"
#include "targets.hpp"
#include "walk.hpp"

namespace tonewalk::fuzz {
namespace {

void check_chunks(const input_file& file) {
    const auto data = find_data_chunk(file);
    if (!data)
        return;
    promise(data->offset >= 0 && data->stated_bytes.value_or(0) >= 0, "samples before the file");
    for (const std::size_t frame_bytes : {1U, 4U, 6U, 16U}) {
        const byte_range range = extent_of(file, *data, frame_bytes).range;
        promise(range.size == 0 || (range.size > 0 && range.size <= file.size() - range.offset),
                "samples that leave the file");
    }
}

} // namespace

bool container(input bytes) {
    const memory_file memory{bytes};
    (void)accepted([&] { check_chunks(input_file{memory.path()}); });
    return accepted([&] { walk(*open_container(memory.request(), input_file{memory.path()})); });
}

} // namespace tonewalk::fuzz
