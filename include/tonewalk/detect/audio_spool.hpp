// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <filesystem>
#include <memory>
#include <span>
#include <string>
#include <vector>

#include "tonewalk/base/sample.hpp"
#include "tonewalk/detect/audio_sink.hpp"

namespace tonewalk {

/// Audio put aside on disk until its gain is known: a nameless file of floats in the folder where
/// the output will stand, gone when the spool goes or the process dies.
class audio_spool final : public audio_sink {
public:
    explicit audio_spool(const std::filesystem::path& folder); ///< throws error{unwritable}
    audio_spool(const audio_spool&) = delete;
    audio_spool& operator=(const audio_spool&) = delete;
    ~audio_spool() override;

    /// Never throws for a full disk: the failure is kept for close(), since audio arrives inside a
    /// pass.
    void add(std::span<const float>) override;
    void close(); ///< after the last sample; throws error{unwritable} if any write failed
    [[nodiscard]] sample_index samples() const noexcept { return samples_; }
    [[nodiscard]] float peak() const noexcept { return peak_; } ///< largest magnitude
    /// After close(): fills `out` from sample `first` on; first + out.size() <= samples(). Throws
    /// error{unwritable} when the device fails.
    void read(sample_index first, std::span<float> out) const;

private:
    void flush() noexcept;

    std::filesystem::path folder_;
    int descriptor_ = -1;
    int failure_ = 0; // errno of the first write that failed
    std::vector<float> buffer_;
    sample_index samples_ = 0;
    float peak_ = 0.0F;
};

} // namespace tonewalk
