// SPDX-License-Identifier: GPL-3.0-or-later
// What libFuzzer calls; built once for each target, which the build names.
#include <cstdint>

#include "targets.hpp"

extern "C" int LLVMFuzzerTestOneInput(const std::uint8_t* bytes, std::size_t size) {
    tonewalk::fuzz::TONEWALK_FUZZ_TARGET(std::as_bytes(std::span{bytes, size}));
    return 0;
}
