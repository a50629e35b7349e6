// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/base/output_file.hpp"

#include <algorithm>
#include <array>
#include <atomic>
#include <cerrno>
#include <climits>
#include <cstdio>
#include <cstring>
#include <optional>
#include <system_error>
#include <utility>
#include <vector>

#include <fcntl.h>
#include <fmt/format.h>
#include <poll.h>
#include <sys/stat.h>
#include <unistd.h>

#include "tonewalk/base/error.hpp"
#include "tonewalk/base/text.hpp"

namespace tonewalk {
namespace {

namespace fs = std::filesystem;

constexpr std::size_t buffer_bytes = 65536;

std::string_view mend_for(int code) {
    switch (code) {
    case ENOSPC:
    case EDQUOT:
    case EFBIG:
        return "make room or choose another folder";
    case EEXIST:
        return "choose another name or add --force";
    case ENOENT:
        return "make the folder first";
    case EACCES:
    case EPERM:
    case EROFS:
        return "choose a folder in which you may write";
    default:
        return "choose another name or folder";
    }
}

[[noreturn]] void refuse(const fs::path& target, std::string_view what, int code) {
    throw error{fault::unwritable, what,
                target == "-" ? "standard output" : valid_utf8(target.string()), mend_for(code)};
}

[[noreturn]] void fail(const fs::path& target, int code) {
    refuse(target, fmt::format("cannot be written ({})", std::generic_category().message(code)),
           code);
}

/// Names of temporaries that stand on disk, readable from a signal handler: plain memory, fixed
/// places.
class temporary_table {
public:
    bool enter(const fs::path& path) noexcept {
        if (path.native().size() >= PATH_MAX)
            return false;
        for (place& each : places_) {
            int expected = vacant;
            if (!each.state.compare_exchange_strong(expected, changing))
                continue;
            std::memcpy(each.path, path.c_str(), path.native().size() + 1);
            each.state.store(taken);
            return true;
        }
        return false;
    }
    void leave(const fs::path& path) noexcept {
        for (place& each : places_)
            if (each.state.load() == taken && path.native() == each.path)
                each.state.store(vacant);
    }
    void unlink_all() noexcept {
        for (const place& each : places_)
            if (each.state.load() == taken)
                ::unlink(each.path);
    }

private:
    enum : int { vacant, changing, taken };
    struct place {
        std::atomic<int> state{vacant};
        char path[PATH_MAX] = {};
    };
    static_assert(std::atomic<int>::is_always_lock_free);
    std::array<place, 64> places_;
};
temporary_table temporaries;

fs::path folder_of(const fs::path& target) {
    return target.has_parent_path() ? target.parent_path() : fs::path{"."};
}

/// Where a forced write through a symbolic link lands.
fs::path behind_links(const fs::path& target) {
    std::error_code failure;
    fs::path real = fs::canonical(target, failure);
    return failure ? target : real;
}

/// ".NAME.1234-0.part" beside the target, cut so that the name fits where the target's does.
fs::path name_beside(const fs::path& target) {
    static std::atomic<unsigned> counter{0};
    const std::string tail = fmt::format(".{}-{}.part", ::getpid(), counter++);
    const std::string name = target.filename().string().substr(0, NAME_MAX - 1 - tail.size());
    return target.parent_path() / ("." + name + tail);
}

/// What cannot be looked at is left for open() to complain about.
void refuse_what_stands_there(const fs::path& target, bool force) {
    std::error_code failure;
    if (target.filename().empty() || fs::is_directory(target, failure))
        refuse(target, "is a folder", EISDIR);
    if (!force && fs::exists(fs::symlink_status(target, failure)))
        refuse(target, "exists already", EEXIST);
    const fs::path folder = folder_of(target);
    if (fs::status(folder, failure).type() == fs::file_type::not_found)
        refuse(target, "is in a folder that does not exist", ENOENT);
    if (fs::exists(folder, failure) && !fs::is_directory(folder, failure))
        refuse(target, "is in what is no folder", ENOTDIR);
}

/// Renames, but never over another file: 0 or the reason. Falls back where the file system lacks
/// the call.
int rename_without_replacing(const fs::path& from, const fs::path& to) noexcept {
    if (::renameat2(AT_FDCWD, from.c_str(), AT_FDCWD, to.c_str(), RENAME_NOREPLACE) == 0)
        return 0;
    if (errno != EINVAL && errno != ENOSYS)
        return errno;
    if (::link(from.c_str(), to.c_str()) == 0)
        return ::unlink(from.c_str()) == 0 ? 0 : errno;
    return errno;
}

/// So that the new name survives a power cut. Some file systems cannot; the file itself is synced.
void sync_folder(const fs::path& target) noexcept {
    const int descriptor = ::open(folder_of(target).c_str(), O_RDONLY | O_DIRECTORY | O_CLOEXEC);
    if (descriptor < 0)
        return;
    ::fsync(descriptor);
    ::close(descriptor);
}

void wait_until_writable(int descriptor) noexcept {
    pollfd waiting{descriptor, POLLOUT, 0};
    ::poll(&waiting, 1, -1);
}

/// What an output names on disk, for comparing; nothing for what does not exist and for devices.
std::optional<std::pair<dev_t, ino_t>> identity(const fs::path& target) {
    struct stat facts {};
    const int failed =
        target == "-" ? ::fstat(STDOUT_FILENO, &facts) : ::stat(target.c_str(), &facts);
    if (failed != 0 || S_ISCHR(facts.st_mode))
        return std::nullopt;
    return std::pair{facts.st_dev, facts.st_ino};
}

bool same_file(const fs::path& a, const fs::path& b) {
    const auto whole = [](const fs::path& path) {
        std::error_code failure;
        const fs::path full = fs::absolute(path, failure);
        const fs::path found = failure ? fs::path{} : fs::weakly_canonical(full, failure);
        return failure ? path.lexically_normal() : found;
    };
    if (a == b || (a != "-" && b != "-" && whole(a) == whole(b)))
        return true;
    const auto left = identity(a);
    return left && left == identity(b);
}

} // namespace

output_file::output_file(std::filesystem::path target, bool force)
    : target_{std::move(target)}, force_{force} {
    if (target_ == "-") {
        descriptor_ = STDOUT_FILENO;
        in_place_ = true;
        return;
    }
    std::error_code failure;
    const fs::file_status there = fs::status(target_, failure);
    if (failure && there.type() != fs::file_type::not_found)
        fail(target_, failure.value());
    in_place_ = fs::exists(there) && !fs::is_regular_file(there) && !fs::is_directory(there);
    if (in_place_) {
        descriptor_ = ::open(target_.c_str(), O_WRONLY | O_NOCTTY | O_CLOEXEC);
    } else {
        refuse_what_stands_there(target_, force_);
        target_ = behind_links(target_);
        temporary_ = name_beside(target_);
        if (!temporaries.enter(temporary_))
            refuse(target_, "has too long a path, or too many outputs are open", 0);
        descriptor_ = ::open(temporary_.c_str(), O_RDWR | O_CREAT | O_EXCL | O_CLOEXEC, 0666);
    }
    if (descriptor_ < 0) {
        const int failed = errno;
        temporaries.leave(temporary_);
        fail(target_, failed);
    }
}

output_file::output_file(output_file&& other) noexcept {
    *this = std::move(other);
}

output_file& output_file::operator=(output_file&& other) noexcept {
    std::swap(target_, other.target_);
    std::swap(temporary_, other.temporary_);
    std::swap(buffer_, other.buffer_);
    std::swap(descriptor_, other.descriptor_);
    std::swap(force_, other.force_);
    std::swap(in_place_, other.in_place_);
    std::swap(committed_, other.committed_);
    std::swap(reader_gone_, other.reader_gone_);
    return *this;
}

output_file::~output_file() {
    if (descriptor_ >= 0 && descriptor_ != STDOUT_FILENO)
        ::close(descriptor_);
    if (temporary_.empty() || committed_)
        return;
    ::unlink(temporary_.c_str());
    temporaries.leave(temporary_);
}

void output_file::write(std::string_view text) {
    if (reader_gone_)
        return;
    buffer_ += text;
    if (buffer_.size() >= buffer_bytes)
        flush();
}

void output_file::write(std::span<const std::byte> bytes) {
    write(std::string_view{reinterpret_cast<const char*>(bytes.data()), bytes.size()});
}

void output_file::flush() {
    const int failure = reader_gone_ ? 0 : write_fully(descriptor_, buffer_);
    buffer_.clear();
    if (failure == EPIPE)
        reader_gone_ = true;
    else if (failure != 0)
        fail(target_, failure);
}

void output_file::commit() {
    flush();
    if (in_place_) {
        committed_ = true;
        return;
    }
    if (::fsync(descriptor_) != 0)
        fail(target_, errno);
    if (::close(std::exchange(descriptor_, -1)) != 0)
        fail(target_, errno);
    const int failure = !force_ ? rename_without_replacing(temporary_, target_)
                        : ::rename(temporary_.c_str(), target_.c_str()) == 0 ? 0
                                                                             : errno;
    if (failure == EEXIST)
        refuse(target_, "has appeared meanwhile", EEXIST);
    if (failure != 0)
        fail(target_, failure);
    committed_ = true;
    temporaries.leave(temporary_);
    sync_folder(target_);
}

int write_fully(int descriptor, std::string_view bytes) noexcept {
    while (!bytes.empty()) {
        const ssize_t written = ::write(descriptor, bytes.data(), bytes.size());
        if (written > 0)
            bytes.remove_prefix(static_cast<std::size_t>(written));
        else if (written == 0)
            return EIO; // nothing of something: it would go on like that
        else if (errno == EAGAIN)
            wait_until_writable(descriptor);
        else if (errno != EINTR)
            return errno;
    }
    return 0;
}

void check_distinct_outputs(std::span<const std::filesystem::path> outputs) {
    for (std::size_t i = 0; i < outputs.size(); ++i)
        for (std::size_t j = 0; j < i; ++j)
            if (same_file(outputs[i], outputs[j]))
                throw error{fault::bad_request, "is named for two outputs",
                            outputs[i] == "-" ? "standard output" : valid_utf8(outputs[i].string()),
                            "give each output a name of its own"};
}

void remove_temporaries() noexcept {
    temporaries.unlink_all();
}

} // namespace tonewalk
