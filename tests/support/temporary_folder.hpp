// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cerrno>
#include <cstdlib>
#include <filesystem>
#include <fstream>
#include <iterator>
#include <string>
#include <string_view>
#include <system_error>

namespace tonewalk::test {

/// A new empty folder, removed with all that is in it at the end of the scope.
class temporary_folder {
public:
    temporary_folder() {
        std::string name =
            (std::filesystem::temp_directory_path() / "tonewalk-test-XXXXXX").string();
        if (::mkdtemp(name.data()) == nullptr)
            throw std::system_error{errno, std::generic_category(), name};
        path_ = name;
    }
    temporary_folder(const temporary_folder&) = delete;
    temporary_folder& operator=(const temporary_folder&) = delete;
    ~temporary_folder() {
        std::error_code ignored;
        std::filesystem::remove_all(path_, ignored);
    }
    [[nodiscard]] const std::filesystem::path& path() const noexcept { return path_; }
    [[nodiscard]] std::filesystem::path operator/(std::string_view name) const {
        return path_ / name;
    }

private:
    std::filesystem::path path_;
};

inline void write_file(const std::filesystem::path& path, std::string_view text) {
    std::ofstream file{path, std::ios::binary};
    file.write(text.data(), static_cast<std::streamsize>(text.size()));
    if (!file.flush())
        throw std::system_error{std::make_error_code(std::errc::io_error), path.string()};
}

inline std::string read_file(const std::filesystem::path& path) {
    std::ifstream file{path, std::ios::binary};
    if (!file)
        throw std::system_error{std::make_error_code(std::errc::no_such_file_or_directory),
                                path.string()};
    return {std::istreambuf_iterator<char>{file}, {}};
}

} // namespace tonewalk::test
