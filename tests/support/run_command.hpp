// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <array>
#include <cstdio>
#include <string>
#include <string_view>

#include <sys/wait.h>

namespace tonewalk::test {

struct command_result {
    int status = -1;
    std::string output; ///< standard output and standard error together
};

/// Runs a shell command line and waits for it.
inline command_result run_command(const std::string& line) {
    std::FILE* const pipe = ::popen((line + " 2>&1").c_str(), "r");
    if (pipe == nullptr)
        return {};
    command_result result;
    std::array<char, 4096> part;
    while (const std::size_t read = std::fread(part.data(), 1, part.size(), pipe))
        result.output.append(part.data(), read);
    const int ended = ::pclose(pipe);
    result.status = WIFEXITED(ended) ? WEXITSTATUS(ended) : -1;
    return result;
}

/// In single quotes for the shell.
inline std::string shell_quoted(std::string_view text) {
    std::string line = "'";
    for (const char letter : text)
        line += letter == '\'' ? std::string{"'\\''"} : std::string{letter};
    return line + '\'';
}

} // namespace tonewalk::test
