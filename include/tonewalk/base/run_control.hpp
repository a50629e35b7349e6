// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstdint>
#include <optional>
#include <stop_token>

namespace tonewalk {

/// Told how far a pass has come; called from one thread at a time, at most some ten times a second.
class progress_sink {
public:
    virtual ~progress_sink() = default;
    virtual void advance(std::int64_t samples_done, std::optional<std::int64_t> samples_total) = 0;
};

/// How a long job is run: when to stop, whom to tell, how many threads.
struct run_control {
    std::stop_token stop;
    progress_sink* progress = nullptr;
    unsigned threads = 1;
};

} // namespace tonewalk
