// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstdint>
#include <span>
#include <string>
#include <vector>

#include "tonewalk/base/run_control.hpp"
#include "tonewalk/channel/chain.hpp"
#include "tonewalk/channel/front_end.hpp"
#include "tonewalk/meter/raw_watch.hpp"
#include "tonewalk/recording/stream.hpp"

namespace tonewalk {

enum class pass_end { complete, stopped, input_failed };

struct pass_report {
    pass_end end = pass_end::complete;
    sample_index samples = 0;                     ///< measured, all stretches
    std::vector<std::uint64_t> blocks_per_worker; ///< how the work was shared
    std::string failure;                          ///< one line when input_failed
};

/// How input is cut and shared; results never depend on it.
struct pass_tuning {
    std::size_t block_bytes = 256 * 1024; ///< 64 KiB to 1 MiB
};

/// Reads the recording once. Workers run the front end on blocks in any order; chains (one for each
/// of the front end's channels) and the raw watch get them in block order, one thread at a time.
/// Memory: a ring of slots, at most 8 MiB together, at most 16 workers. A stop request wakes a
/// blocked read; what was claimed drains, and a stretch that is cut off ends as if the recording
/// ended there. The same where the input fails. Then the chains finish. Throws what a chain throws;
/// chains are left unfinished then.
pass_report run_pass(block_source&, const front_end&, std::span<chain* const>, raw_watch&,
                     const run_control&, const pass_tuning& = {});

} // namespace tonewalk
