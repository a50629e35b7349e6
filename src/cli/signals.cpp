// SPDX-License-Identifier: GPL-3.0-or-later
#include "signals.hpp"

#include <csignal>
#include <ctime>

#include <unistd.h>

#include "print_out.hpp"
#include "tonewalk/base/output_file.hpp"

namespace tonewalk::cli {
namespace {

sigset_t stopping_signals() {
    sigset_t set;
    sigemptyset(&set);
    sigaddset(&set, SIGINT);
    sigaddset(&set, SIGTERM);
    return set;
}

} // namespace

stop_watch::stop_watch() {
    std::signal(SIGPIPE, SIG_IGN);
    std::signal(SIGXFSZ, SIG_IGN);
    const sigset_t set = stopping_signals();
    pthread_sigmask(SIG_BLOCK, &set,
                    nullptr); // every later thread inherits this; the watcher waits
    watcher_ = std::jthread{[this](const std::stop_token& ending) { watch(ending); }};
}

stop_watch::~stop_watch() = default;

void stop_watch::watch(const std::stop_token& ending) {
    const sigset_t set = stopping_signals();
    const timespec a_while{.tv_sec = 0, .tv_nsec = 50'000'000};
    while (!ending.stop_requested()) {
        const int signal = sigtimedwait(&set, nullptr, &a_while);
        if (signal < 0) {
            continue;
        }
        if (status_.load() != 0 || !holding_.load()) {
            if (status_.load() == 0) {
                complain(stopped_line);
            }
            remove_temporaries();
            _exit(128 + signal);
        }
        status_.store(128 + signal);
        source_.request_stop();
    }
}

} // namespace tonewalk::cli
