// SPDX-License-Identifier: GPL-3.0-or-later
#include "print_out.hpp"

#include <cerrno>
#include <cstdio>
#include <system_error>

#include <fcntl.h>
#include <fmt/core.h>
#include <unistd.h>

#include "tonewalk/base/error.hpp"
#include "tonewalk/base/text.hpp"

namespace tonewalk::cli {

void keep_standard_descriptors() {
    for (const int descriptor : {STDIN_FILENO, STDOUT_FILENO, STDERR_FILENO}) {
        if (::fcntl(descriptor, F_GETFD) < 0 && errno == EBADF) {
            static_cast<void>(::open("/dev/null", O_RDWR)); // takes the lowest number: this one
        }
    }
}

void print_out(std::string_view text) {
    errno = 0;
    const std::size_t written = std::fwrite(text.data(), 1, text.size(), stdout);
    const bool flushed = std::fflush(stdout) == 0;
    if ((written == text.size() && flushed) || errno == EPIPE) {
        return;
    }
    throw error{fault::unwritable,
                fmt::format("cannot be written ({})", std::generic_category().message(errno)),
                "standard output", "make room, or send it elsewhere"};
}

void complain(const std::string& line) {
    fmt::print(stderr, "tonewalk: {}\n", one_line(valid_utf8(line)));
}

} // namespace tonewalk::cli
