// SPDX-License-Identifier: GPL-3.0-or-later
#include "version.hpp"

#include <string>
#include <string_view>

#include <fmt/core.h>

#include "print_out.hpp"

namespace tonewalk::cli {
namespace {

struct inside {
    std::string_view library, licence;
};

// Licences as stated in each Debian package's copyright file.
constexpr inside libraries[] = {
    {"FFTW (single precision)", "GPL-2.0-or-later"},
    {"libsndfile", "LGPL-2.1-or-later"},
    {"libarchive", "BSD-2-Clause"},
    {"OpenSSL libcrypto", "Apache-2.0"},
    {"Boost.Math", "BSL-1.0"},
    {"Eigen", "MPL-2.0"},
    {"nlohmann-json", "MIT"},
    {"toml++", "MIT"},
    {"libcsv", "LGPL-2.1-or-later"},
    {"fmt", "MIT"},
    {"CLI11", "BSD-3-Clause"},
};

} // namespace

void print_version(bool licences) {
    std::string text = fmt::format("tonewalk {}\n", TONEWALK_VERSION);
    if (licences) {
        text +=
            "GPL-3.0-or-later; there is no warranty, to the extent permitted by law.\n\nInside:\n";
        for (const inside& each : libraries) {
            text += fmt::format("  {:<26} {}\n", each.library, each.licence);
        }
    }
    print_out(text);
}

} // namespace tonewalk::cli
