// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/report/audio_file.hpp"

#include <algorithm>
#include <array>
#include <cassert>
#include <cerrno>
#include <cmath>
#include <cstdio>
#include <optional>
#include <string>
#include <system_error>
#include <utility>

#include <fmt/format.h>
#include <sndfile.h>
#include <unistd.h>

#include "tonewalk/base/error.hpp"
#include "tonewalk/base/near_name.hpp"
#include "tonewalk/base/output_file.hpp"
#include "tonewalk/base/text.hpp"

namespace tonewalk {
namespace {

constexpr std::size_t block_samples = 4096;
constexpr double highest_rate_hz = 655350.0; // FLAC's limit; WAV keeps to it too
constexpr std::array<std::string_view, 3> sample_names{"pcm16", "pcm24", "float"};

int subtype_of(audio_sample sample) {
    switch (sample) {
    case audio_sample::pcm16:
        return SF_FORMAT_PCM_16;
    case audio_sample::pcm24:
        return SF_FORMAT_PCM_24;
    case audio_sample::float32:
        return SF_FORMAT_FLOAT;
    }
    assert(false);
    return 0;
}

int bytes_of(audio_sample sample) {
    return sample == audio_sample::pcm16 ? 2 : sample == audio_sample::pcm24 ? 3 : 4;
}

/// RF64 only where needed: it implies the extensible form of the format chunk.
bool fits_plain_wav(audio_sample sample, std::optional<std::int64_t> samples) {
    constexpr std::int64_t most_bytes = 0xFFFF'0000;
    return samples && *samples <= most_bytes / bytes_of(sample);
}

SF_INFO info_of(const audio_file::config& wanted, std::optional<std::int64_t> samples) {
    const bool flac = audio_container_of(wanted.target) == audio_container::flac;
    SF_INFO info{};
    info.samplerate = static_cast<int>(wanted.rate_hz);
    info.channels = 1;
    info.format =
        subtype_of(wanted.sample) | (flac                                     ? SF_FORMAT_FLAC
                                     : fits_plain_wav(wanted.sample, samples) ? SF_FORMAT_WAV
                                                                              : SF_FORMAT_RF64);
    return info;
}

void refuse_what_does_not_fit(const audio_file::config& wanted, audio_container container) {
    const std::string where = valid_utf8(wanted.target.string());
    if (container == audio_container::flac && wanted.sample == audio_sample::float32)
        throw error{fault::bad_request, "FLAC holds no floating-point samples", where,
                    "choose pcm16 or pcm24, or a name that ends in .wav"};
    if (!(wanted.rate_hz >= 1.0 && wanted.rate_hz <= highest_rate_hz &&
          wanted.rate_hz == std::floor(wanted.rate_hz)))
        throw error{fault::bad_request, fmt::format("{} Hz is no audio rate", wanted.rate_hz),
                    where, "choose a whole number of hertz up to 655350, like 48000"};
}

/// Full scale 1.0 to 2^(bits-1), rounded, in the upper bits of an int.
int to_integer(float sample, int bits) {
    const float scale = std::ldexp(1.0F, bits - 1);
    const long highest = (1L << (bits - 1)) - 1;
    const long code = std::clamp(std::lrint(sample * scale), -highest - 1, highest);
    return static_cast<int>(code * (1L << (32 - bits)));
}

/// What libsndfile writes through: a descriptor, and the first failure, which libsndfile itself
/// forgets when it happens while the file is closed.
struct descriptor_io {
    int descriptor = -1;
    int failure = 0; ///< errno

    static descriptor_io& of(void* self) { return *static_cast<descriptor_io*>(self); }
    static sf_count_t length(void* self) {
        const sf_count_t here = tell(self);
        const sf_count_t end = seek(0, SEEK_END, self);
        seek(here, SEEK_SET, self);
        return end;
    }
    static sf_count_t seek(sf_count_t offset, int whence, void* self) {
        return ::lseek(of(self).descriptor, offset, whence);
    }
    static sf_count_t tell(void* self) { return seek(0, SEEK_CUR, self); }
    static sf_count_t read(void* into, sf_count_t bytes, void* self) {
        return ::read(of(self).descriptor, into, static_cast<std::size_t>(bytes));
    }
    static sf_count_t write(const void* from, sf_count_t bytes, void* self) {
        const std::string_view all{static_cast<const char*>(from), static_cast<std::size_t>(bytes)};
        if (of(self).failure == 0)
            of(self).failure = write_fully(of(self).descriptor, all);
        return of(self).failure == 0 ? bytes : 0;
    }
    /// Libsndfile 1.2 keeps RF64's peak chunk, with its time stamp, although told not to: made
    /// into padding.
    void blank_peak_chunk() {
        std::array<char, 512> head;
        const ssize_t size = ::pread(descriptor, head.data(), head.size(), 0);
        const std::string_view text{head.data(),
                                    static_cast<std::size_t>(std::max<ssize_t>(size, 0))};
        const std::size_t chunk = text.find("PEAK");
        if (!text.starts_with("R") || chunk > text.find("data"))
            return;
        constexpr std::array<char, 16> zeros{};
        if (::pwrite(descriptor, "PAD ", 4, static_cast<off_t>(chunk)) != 4 ||
            ::pwrite(descriptor, zeros.data(), zeros.size(), static_cast<off_t>(chunk + 8)) != 16)
            failure = errno;
    }
    static inline SF_VIRTUAL_IO functions{&length, &seek, &read, &write, &tell};
};

} // namespace

/// Libsndfile writes into a descriptor that it can seek in: the output's own temporary; where the
/// output is a pipe or device, a nameless file that is copied at the end.
struct audio_file::state {
    struct close_sound {
        void operator()(SNDFILE* open) const noexcept { sf_close(open); }
    };
    struct close_file {
        void operator()(std::FILE* open) const noexcept { std::fclose(open); }
    };

    config wanted;
    output_file out;
    std::unique_ptr<std::FILE, close_file> detour; // only where `out` cannot seek
    descriptor_io io;
    std::unique_ptr<SNDFILE, close_sound> sound;
    std::optional<std::int64_t> expected;
    std::int64_t clipped = 0, added = 0;

    explicit state(const config& given) : wanted{given}, out{given.target, given.force} {
        io.descriptor = out.descriptor();
        if (out.in_place()) {
            detour.reset(std::tmpfile());
            if (!detour)
                fail(std::generic_category().message(errno));
            io.descriptor = ::fileno(detour.get());
        }
    }

    void open_sound() {
        SF_INFO info = info_of(wanted, expected);
        sound.reset(sf_open_virtual(&descriptor_io::functions, SFM_WRITE, &info, &io));
        if (!sound)
            fail(sf_strerror(nullptr));
        sf_command(sound.get(), SFC_SET_ADD_PEAK_CHUNK, nullptr, SF_FALSE);
        sf_command(sound.get(), SFC_RF64_AUTO_DOWNGRADE, nullptr, SF_TRUE);
    }

    [[noreturn]] void fail(std::string reason) const {
        if (io.failure != 0)
            reason = std::generic_category().message(io.failure);
        throw error{fault::unwritable, fmt::format("audio cannot be written ({})", reason),
                    valid_utf8(wanted.target.string()), "make room or choose another folder"};
    }

    void check(sf_count_t written, std::size_t frames) const {
        if (written != static_cast<sf_count_t>(frames))
            fail(sf_strerror(sound.get()));
    }

    void add_integers(std::span<const float> samples, int bits) {
        std::array<int, block_samples> codes;
        const auto outside = [](float x) { return x > 1.0F || x < -1.0F; };
        clipped += std::count_if(samples.begin(), samples.end(), outside);
        std::transform(samples.begin(), samples.end(), codes.begin(),
                       [bits](float x) { return to_integer(x, bits); });
        check(sf_writef_int(sound.get(), codes.data(), static_cast<sf_count_t>(samples.size())),
              samples.size());
    }

    void add_block(std::span<const float> samples) {
        if (wanted.sample == audio_sample::float32)
            check(sf_writef_float(sound.get(), samples.data(),
                                  static_cast<sf_count_t>(samples.size())),
                  samples.size());
        else
            add_integers(samples, wanted.sample == audio_sample::pcm16 ? 16 : 24);
    }

    void copy_detour() {
        std::array<std::byte, 65536> part;
        std::rewind(detour.get());
        while (const std::size_t read = std::fread(part.data(), 1, part.size(), detour.get()))
            out.write(std::span{part}.first(read));
        if (std::ferror(detour.get()) != 0)
            fail(std::generic_category().message(errno));
    }

    void add(std::span<const float> samples) {
        added += static_cast<std::int64_t>(samples.size());
        assert(!expected || added <= *expected);
        if (!sound)
            open_sound();
        while (!samples.empty()) {
            const std::size_t count = std::min(samples.size(), block_samples);
            add_block(samples.first(count));
            samples = samples.subspan(count);
        }
    }

    void finish() {
        if (!sound)
            open_sound();
        const int failure = sf_close(sound.release());
        io.blank_peak_chunk();
        if (failure != 0 || io.failure != 0)
            fail(sf_error_number(failure));
        if (detour)
            copy_detour();
        out.commit();
    }
};

audio_sample parse_audio_sample(std::string_view text, std::string_view option) {
    const auto found = std::find(sample_names.begin(), sample_names.end(), text);
    if (found == sample_names.end())
        throw error{fault::bad_request, fmt::format("{} is not known", in_quotes(text)), option,
                    name_hint(text, sample_names)};
    return static_cast<audio_sample>(found - sample_names.begin());
}

audio_container audio_container_of(const std::filesystem::path& target) {
    const std::string ending = lower_case(target.extension().string());
    if (ending == ".wav")
        return audio_container::wav;
    if (ending == ".flac")
        return audio_container::flac;
    throw error{fault::bad_request, "names no kind of audio file", valid_utf8(target.string()),
                "end the name in .wav or .flac"};
}

audio_file::audio_file(const config& wanted) {
    refuse_what_does_not_fit(wanted, audio_container_of(wanted.target));
    state_ = std::make_unique<state>(wanted);
}

audio_file::audio_file(audio_file&&) noexcept = default;
audio_file& audio_file::operator=(audio_file&&) noexcept = default;
audio_file::~audio_file() = default;

void audio_file::expect(std::int64_t samples) {
    assert(!state_->sound);
    state_->expected = samples;
}

void audio_file::add(std::span<const float> samples) {
    state_->add(samples);
}

void audio_file::finish() {
    state_->finish();
}

std::int64_t audio_file::clipped_samples() const noexcept {
    return state_->clipped;
}

} // namespace tonewalk
