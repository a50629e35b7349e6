// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cerrno>
#include <filesystem>
#include <string>
#include <system_error>

#include <sys/mman.h>
#include <unistd.h>

#include "targets.hpp"
#include "tonewalk/recording/stream.hpp"

namespace tonewalk::fuzz {

/// The input as a file that never touches a disk.
class memory_file {
public:
    explicit memory_file(input bytes) : descriptor_{::memfd_create("input", MFD_CLOEXEC)} {
        const bool written = descriptor_ >= 0 && ::write(descriptor_, bytes.data(), bytes.size()) ==
                                                     static_cast<::ssize_t>(bytes.size());
        if (!written) {
            const int code = errno;
            ::close(descriptor_);
            throw std::system_error{code, std::generic_category(), "memory file"};
        }
    }
    memory_file(const memory_file&) = delete;
    memory_file& operator=(const memory_file&) = delete;
    ~memory_file() { ::close(descriptor_); }

    [[nodiscard]] std::filesystem::path path() const {
        return "/proc/self/fd/" + std::to_string(descriptor_);
    }
    [[nodiscard]] recording_request request() const {
        recording_request whole;
        whole.path = path().string();
        return whole;
    }

private:
    int descriptor_;
};

} // namespace tonewalk::fuzz
