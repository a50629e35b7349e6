// SPDX-License-Identifier: GPL-3.0-or-later
#include "progress.hpp"

#include <algorithm>
#include <cmath>
#include <cstdio>

#include <fmt/core.h>
#include <unistd.h>

namespace tonewalk::cli {
namespace {

constexpr std::chrono::milliseconds quiet_start{1000}, terminal_spacing{100}, log_spacing{5000};

std::string minutes_and_seconds(double seconds) {
    const auto whole = std::lround(std::max(0.0, seconds));
    return whole < 60 ? fmt::format("{} s", whole)
                      : fmt::format("{} min {:02} s", whole / 60, whole % 60);
}

} // namespace

progress_line::progress_line(progress_choice choice, double sample_rate_hz)
    : terminal_{isatty(STDERR_FILENO) != 0}, sample_rate_hz_{sample_rate_hz} {
    shown_ =
        choice == progress_choice::always || (choice == progress_choice::automatic && terminal_);
}

progress_line::~progress_line() {
    if (drawn_ && terminal_) {
        std::fputs("\r\x1b[K", stderr);
    }
}

void progress_line::advance(std::int64_t samples_done, std::optional<std::int64_t> samples_total) {
    const auto now = clock::now();
    const auto spacing = terminal_ ? terminal_spacing : log_spacing;
    if (!shown_ || now - start_ < quiet_start || (drawn_ && now - last_ < spacing)) {
        return;
    }
    const std::string line = words(samples_done, samples_total);
    std::fputs((terminal_ ? "\r" + line + "\x1b[K" : line + "\n").c_str(), stderr);
    std::fflush(stderr);
    drawn_ = true;
    last_ = now;
}

std::string progress_line::words(std::int64_t done, std::optional<std::int64_t> total) const {
    const double elapsed_s = std::chrono::duration<double>(clock::now() - start_).count();
    const double rate = static_cast<double>(done) / elapsed_s;
    std::string so_far = fmt::format("{:.1f} s measured, {:.1f} million samples a second",
                                     static_cast<double>(done) / sample_rate_hz_, rate / 1e6);
    if (!total || *total <= 0 || rate <= 0.0) {
        return so_far;
    }
    return fmt::format("{:3.0f} %, {}, {} left",
                       100.0 * static_cast<double>(done) / static_cast<double>(*total), so_far,
                       minutes_and_seconds(static_cast<double>(*total - done) / rate));
}

} // namespace tonewalk::cli
