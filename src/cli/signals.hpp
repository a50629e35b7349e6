// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <atomic>
#include <stop_token>
#include <thread>

namespace tonewalk::cli {

/// Turns SIGINT and SIGTERM into a stop request; one that comes before there are results to hold,
/// or a second one, removes temporaries and leaves at once. One for the whole program, made before
/// any other thread. SIGPIPE and SIGXFSZ become write errors.
class stop_watch {
public:
    stop_watch();
    ~stop_watch();
    stop_watch(const stop_watch&) = delete;
    stop_watch& operator=(const stop_watch&) = delete;
    [[nodiscard]] std::stop_token token() const noexcept { return source_.get_token(); }
    /// From here on a first signal is worth waiting for: what was measured is to be written.
    void hold_results() const noexcept { holding_.store(true); }
    /// 130 after SIGINT, 143 after SIGTERM, 0 when nobody asked to stop.
    [[nodiscard]] int exit_status() const noexcept { return status_.load(); }

private:
    void watch(const std::stop_token& ending);
    std::stop_source source_;
    std::atomic<int> status_{0};
    mutable std::atomic<bool> holding_{false};
    std::jthread watcher_;
};

} // namespace tonewalk::cli
