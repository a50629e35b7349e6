// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/detect/audio_spool.hpp"

#include <algorithm>
#include <cassert>
#include <cerrno>
#include <cmath>
#include <cstdlib>
#include <system_error>

#include <fcntl.h>
#include <unistd.h>

#include <fmt/format.h>

#include "tonewalk/base/error.hpp"
#include "tonewalk/base/output_file.hpp"
#include "tonewalk/base/text.hpp"

namespace tonewalk {
namespace {

constexpr std::size_t buffer_samples = 16384;

[[noreturn]] void fail(const std::filesystem::path& folder, std::string_view what, int cause) {
    throw error{
        fault::unwritable, fmt::format("{} ({})", what, std::generic_category().message(cause)),
        valid_utf8(folder.string()), "free space there or write the audio into another folder"};
}

/// A file without a name; where the file system knows none, one whose name goes at once.
int open_nameless(const std::filesystem::path& folder) {
    const int descriptor = ::open(folder.c_str(), O_TMPFILE | O_RDWR | O_CLOEXEC, 0600);
    if (descriptor >= 0 || (errno != EOPNOTSUPP && errno != EISDIR)) {
        return descriptor;
    }
    std::string name = (folder / ".audio-spool-XXXXXX").string();
    const int named = ::mkostemp(name.data(), O_CLOEXEC);
    if (named >= 0) {
        ::unlink(name.c_str());
    }
    return named;
}

} // namespace

audio_spool::audio_spool(const std::filesystem::path& folder)
    : folder_{folder.empty() ? std::filesystem::path{"."} : folder}, descriptor_{
                                                                         open_nameless(folder_)} {
    if (descriptor_ < 0) {
        fail(folder_, "the audio cannot be put aside", errno);
    }
    buffer_.reserve(buffer_samples);
}

audio_spool::~audio_spool() {
    ::close(descriptor_);
}

void audio_spool::add(std::span<const float> audio) {
    for (const float sample : audio) {
        peak_ = std::max(peak_, std::abs(sample));
    }
    samples_ += static_cast<sample_index>(audio.size());
    while (!audio.empty()) {
        const auto part = audio.first(std::min(audio.size(), buffer_samples - buffer_.size()));
        buffer_.insert(buffer_.end(), part.begin(), part.end());
        audio = audio.subspan(part.size());
        if (buffer_.size() == buffer_samples) {
            flush();
        }
    }
}

void audio_spool::flush() noexcept {
    const auto bytes = std::as_bytes(std::span{buffer_});
    if (failure_ == 0) {
        failure_ =
            write_fully(descriptor_, {reinterpret_cast<const char*>(bytes.data()), bytes.size()});
    }
    buffer_.clear();
}

void audio_spool::close() {
    flush();
    if (failure_ != 0) {
        fail(folder_, "the audio cannot be put aside", failure_);
    }
}

void audio_spool::read(sample_index first, std::span<float> out) const {
    assert(first >= 0 && first + std::ssize(out) <= samples_);
    auto rest = std::as_writable_bytes(out);
    auto offset = static_cast<off_t>(first) * static_cast<off_t>(sizeof(float));
    while (!rest.empty()) {
        const ssize_t got = ::pread(descriptor_, rest.data(), rest.size(), offset);
        if (got == 0 || (got < 0 && errno != EINTR)) {
            fail(folder_, "the audio put aside cannot be read back", got == 0 ? EIO : errno);
        }
        const auto bytes = static_cast<std::size_t>(std::max<ssize_t>(got, 0));
        rest = rest.subspan(bytes);
        offset += static_cast<off_t>(bytes);
    }
}

} // namespace tonewalk
