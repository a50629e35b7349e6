// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <chrono>
#include <string>

#include "tonewalk/base/run_control.hpp"

namespace tonewalk::cli {

enum class progress_choice { automatic, always, never };

/// One line on standard error that is redrawn while a long pass runs: share done, rate, time left.
/// Nothing is shown in the first second. On a terminal the line is wiped at the end; elsewhere
/// (always) it is written as a line every 5 s.
class progress_line final : public progress_sink {
public:
    progress_line(progress_choice, double sample_rate_hz);
    ~progress_line() override;
    void advance(std::int64_t samples_done, std::optional<std::int64_t> samples_total) override;

private:
    using clock = std::chrono::steady_clock;
    [[nodiscard]] std::string words(std::int64_t done, std::optional<std::int64_t> total) const;
    bool shown_ = false, terminal_ = false, drawn_ = false;
    double sample_rate_hz_;
    clock::time_point start_ = clock::now(), last_ = start_;
};

} // namespace tonewalk::cli
