// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstdint>
#include <filesystem>
#include <memory>
#include <span>
#include <string_view>

#include "tonewalk/detect/audio_sink.hpp"

namespace tonewalk {

enum class audio_sample { pcm16, pcm24, float32 };
/// "pcm16", "pcm24", "float"; throws error{bad_request} naming `option`.
[[nodiscard]] audio_sample parse_audio_sample(std::string_view text, std::string_view option);

enum class audio_container { wav, flac };
/// From the name's ending, .wav or .flac, large or small letters; throws error{bad_request} for
/// others.
[[nodiscard]] audio_container audio_container_of(const std::filesystem::path&);

/// A mono audio file that appears whole or not at all. WAV turns into RF64 where it passes 4
/// GiB. 1.0 is full scale: integers scale by 2^(bits-1), rounded; beyond ±1.0 they are clamped and
/// counted, floats are kept. Equal samples and expectations give equal bytes: no time stamps, no
/// peak chunk. Throws error{bad_request} for what the container cannot hold, error{unwritable} like
/// output_file.
class audio_file final : public audio_sink {
public:
    struct config {
        std::filesystem::path target;
        double rate_hz = 48000.0; ///< a whole number, 1 to 655350
        audio_sample sample = audio_sample::pcm16;
        bool force = false; ///< replace a file that is there
    };
    explicit audio_file(const config&);
    audio_file(audio_file&&) noexcept;
    audio_file& operator=(audio_file&&) noexcept;
    ~audio_file() override; ///< without finish(): nothing is left behind

    /// How many samples will come at most, said before the first: what fits makes plain WAV, which
    /// everything reads. Not said: the extensible form, which a few old readers refuse.
    void expect(std::int64_t samples);
    void add(std::span<const float>) override; ///< finite samples
    void finish();                             ///< completes the file and gives it its name
    [[nodiscard]] std::int64_t clipped_samples() const noexcept;

private:
    struct state;
    std::unique_ptr<state> state_;
};

} // namespace tonewalk
