// SPDX-License-Identifier: GPL-3.0-or-later
#include "container.hpp"

#include <array>
#include <bit>
#include <utility>

#include <fmt/format.h>
#include <sndfile.h>

#include "container_chunks.hpp"
#include "sources.hpp"
#include "stated.hpp"
#include "tonewalk/base/error.hpp"
#include "tonewalk/base/text.hpp"

namespace tonewalk {
namespace {

constexpr bool native_big = std::endian::native == std::endian::big;

// A file open in libsndfile.
class sound_file {
public:
    sound_file(const std::filesystem::path& path, bool begins_as_one)
        : handle_{::sf_open(path.c_str(), SFM_READ, &info_)} {
        if (handle_)
            return;
        std::string_view reason = trimmed(::sf_strerror(nullptr));
        reason.remove_suffix(reason.ends_with('.') ? 1 : 0);
        throw error{fault::malformed, fmt::format("is no container that can be read ({})", reason),
                    shown(path),
                    begins_as_one ? "copy it again, or correct its header"
                                  : "give --format and --rate if it is a raw recording"};
    }
    sound_file(sound_file&& other) noexcept
        : info_{other.info_}, handle_{std::exchange(other.handle_, nullptr)} {}
    sound_file& operator=(sound_file&&) = delete;
    ~sound_file() {
        if (handle_)
            ::sf_close(handle_);
    }
    const SF_INFO& info() const noexcept { return info_; }
    SNDFILE* handle() const noexcept { return handle_; }
    int coding() const noexcept { return info_.format & SF_FORMAT_SUBMASK; }
    bool big_endian() const {
        const bool swapped =
            ::sf_command(handle_, SFC_RAW_DATA_NEEDS_ENDSWAP, nullptr, 0) == SF_TRUE;
        return swapped != native_big;
    }

private:
    SF_INFO info_{};
    SNDFILE* handle_;
};

// How a coding is stored, and how it comes out when libsndfile decodes it.
struct coding_facts {
    int coding;
    std::string_view name;
    sample_type stored, decoded;
    unsigned code_bits;
    bool packed_24_bits = false;
};
constexpr std::array<coding_facts, 7> plain_codings{
    {{SF_FORMAT_PCM_S8, "pcm8", sample_type::i8, sample_type::i16, 8},
     {SF_FORMAT_PCM_U8, "pcm8", sample_type::u8, sample_type::i16, 8},
     {SF_FORMAT_PCM_16, "pcm16", sample_type::i16, sample_type::i16, 16},
     {SF_FORMAT_PCM_24, "pcm24", sample_type::i32, sample_type::i32, 24, true},
     {SF_FORMAT_PCM_32, "pcm32", sample_type::i32, sample_type::i32, 32},
     {SF_FORMAT_FLOAT, "float", sample_type::f32, sample_type::f32, 0},
     {SF_FORMAT_DOUBLE, "double", sample_type::f64, sample_type::f64, 0}}};

const coding_facts* plain_coding(int coding) {
    for (const auto& facts : plain_codings)
        if (facts.coding == coding)
            return &facts;
    return nullptr;
}

// What libsndfile calls a container ("wav") or a coding ("u-law").
std::string library_name(int format) {
    SF_FORMAT_INFO facts{};
    facts.format = format;
    if (::sf_command(nullptr, SFC_GET_FORMAT_INFO, &facts, sizeof facts) != 0)
        return "container";
    return lower_case(facts.extension ? facts.extension : facts.name);
}

std::string format_name(const sound_file& sound, const coding_facts* coding) {
    const int kind = sound.info().format & SF_FORMAT_TYPEMASK;
    return fmt::format("{} {}", library_name(kind == SF_FORMAT_WAVEX ? SF_FORMAT_WAV : kind),
                       coding ? std::string{coding->name} : library_name(sound.coding()));
}

class sound_decoder final : public frame_decoder {
public:
    sound_decoder(sound_file sound, sample_format format, std::string name)
        : sound_{std::move(sound)}, format_{format}, name_{std::move(name)} {}

    void seek(sample_index frame) override {
        if (::sf_seek(sound_.handle(), frame, SEEK_SET) != frame)
            throw error{fault::unreadable, fmt::format("cannot be read from sample {} on", frame),
                        name_, "leave --from out, or convert it to a format that can be searched"};
    }

    std::size_t read(std::span<std::byte> out) override {
        const auto frames = static_cast<sf_count_t>(out.size() / format_.sample_bytes());
        return static_cast<std::size_t>(std::max<sf_count_t>(read_frames(out.data(), frames), 0));
    }

private:
    // The caller's buffers come from allocators and so suit every sample type.
    sf_count_t read_frames(void* out, sf_count_t frames) {
        SNDFILE* const from = sound_.handle();
        switch (format_.type) {
        case sample_type::i16:
            return ::sf_readf_short(from, static_cast<short*>(out), frames);
        case sample_type::i32:
            return ::sf_readf_int(from, static_cast<int*>(out), frames);
        case sample_type::f64:
            return ::sf_readf_double(from, static_cast<double*>(out), frames);
        default:
            return ::sf_readf_float(from, static_cast<float*>(out), frames);
        }
    }

    sound_file sound_;
    sample_format format_;
    std::string name_;
};

void check_channels(const sound_file& sound, const input_file& file) {
    const int channels = sound.info().channels;
    if (channels != 1 && channels != 2)
        throw error{fault::unsupported,
                    fmt::format("has {} channels, neither one (real) nor two (I and Q)", channels),
                    file.name(), "keep the channels of one signal"};
}

// The container's samples as one stretch, and where they lie unless they must be decoded.
struct container_samples {
    stream_facts facts;
    std::vector<std::string> overridden;
    std::optional<std::int64_t> first_byte;
    bool packed_24_bits = false;
};

container_samples plain_samples(const sound_file& sound, const input_file& file,
                                const coding_facts& coding, const data_chunk& data) {
    container_samples samples;
    samples.facts.format = {coding.stored, sound.info().channels == 2,
                            coding.code_bits != 8 && sound.big_endian()};
    samples.facts.code_bits = coding.code_bits;
    if (data.valid_bits != 0 && data.valid_bits < coding.code_bits)
        samples.facts.code_bits = data.valid_bits;
    samples.packed_24_bits = coding.packed_24_bits;
    std::size_t frame = samples.facts.frame_bytes();
    if (coding.packed_24_bits)
        frame = frame / 4 * 3;
    const data_extent extent = extent_of(file, data, frame);
    if (!extent.short_by.empty())
        samples.facts.notes.add({note_code::container_short, severity::warning, extent.short_by,
                                 "copy the file again if it was cut off"});
    if (!extent.overridden.empty())
        samples.overridden.push_back(extent.overridden);
    samples.first_byte = extent.range.offset;
    const data_layout layout = lay_out_frames(extent.range.size, frame);
    for (const auto& stretch : layout.stretches)
        samples.facts.stretches.push_back(stretch.facts);
    note_odd_tail(samples.facts.notes, layout.odd_bytes, frame);
    return samples;
}

container_samples coded_samples(const sound_file& sound, const coding_facts* coding) {
    container_samples samples;
    samples.facts.format = {coding ? coding->decoded : sample_type::f32, sound.info().channels == 2,
                            native_big};
    samples.facts.code_bits = coding ? coding->code_bits : 0;
    if (sound.info().frames > 0)
        samples.facts.stretches.push_back({0, sound.info().frames, 0, std::nullopt});
    return samples;
}

} // namespace

bool named_like_container(const std::filesystem::path& path) {
    const std::string extension = lower_case(path.extension().string());
    int kinds = 0;
    ::sf_command(nullptr, SFC_GET_FORMAT_MAJOR_COUNT, &kinds, sizeof kinds);
    for (int kind = 0; kind < kinds; ++kind) {
        SF_FORMAT_INFO facts{};
        facts.format = kind;
        ::sf_command(nullptr, SFC_GET_FORMAT_MAJOR, &facts, sizeof facts);
        if (facts.format != SF_FORMAT_RAW && facts.extension &&
            extension == "." + std::string{facts.extension})
            return true;
    }
    return extension == ".aif" || extension == ".snd" || extension == ".wave";
}

std::unique_ptr<block_source> open_container(const recording_request& request, input_file file) {
    sound_file sound{request.path, looks_like_container(file)};
    check_channels(sound, file);
    const coding_facts* const coding = plain_coding(sound.coding());
    const auto data = coding ? find_data_chunk(file) : std::nullopt;
    container_samples samples =
        data ? plain_samples(sound, file, *coding, *data) : coded_samples(sound, coding);
    stream_facts& facts = samples.facts;
    facts.name = request.path;
    facts.format_name = format_name(sound, coding);
    const auto stated_rate = static_cast<double>(sound.info().samplerate);
    facts.sample_rate_hz = rate_to_use(request, stated_rate, file.name());
    (void)apply(request, {stated_rate, samples.overridden}, facts);
    if (request.verify)
        facts.sha512 = sha512_of(file, {0, file.size()});
    if (!samples.first_byte) {
        auto decoder = std::make_unique<sound_decoder>(std::move(sound), facts.format, file.name());
        return make_decoder_source(std::move(facts), std::move(decoder));
    }
    return make_file_source(std::move(facts), std::move(file),
                            {{*samples.first_byte}, samples.packed_24_bits});
}

} // namespace tonewalk
