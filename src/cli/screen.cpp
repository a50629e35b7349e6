// SPDX-License-Identifier: GPL-3.0-or-later
#include "screen.hpp"

#include <algorithm>
#include <cstdlib>
#include <string_view>

#include <sys/ioctl.h>
#include <unistd.h>

namespace tonewalk::cli {
namespace {

std::string_view environment(const char* name) {
    const char* const value = std::getenv(name);
    return value != nullptr ? value : "";
}

} // namespace

int screen_columns(int descriptor) {
    constexpr int usual = 80, least = 40;
    winsize size{};
    if (ioctl(descriptor, TIOCGWINSZ, &size) == 0 && size.ws_col > 0) {
        return std::max<int>(least, size.ws_col);
    }
    return usual;
}

bool shows_colour(int descriptor) {
    return isatty(descriptor) != 0 && environment("NO_COLOR").empty() &&
           environment("TERM") != "dumb";
}

} // namespace tonewalk::cli
