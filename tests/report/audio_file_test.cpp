// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/report/audio_file.hpp"

#include <bit>
#include <cmath>
#include <csignal>
#include <thread>
#include <vector>

#include <fmt/format.h>
#include <sys/resource.h>
#include <sys/stat.h>

#include "support/expect_error.hpp"
#include "support/run_command.hpp"
#include "support/temporary_folder.hpp"

namespace {

using namespace tonewalk;
using test::caught;
namespace fs = std::filesystem;

/// 0.5 sin at 1 kHz; enough to leave the writer's first block.
std::vector<float> tone(std::size_t samples) {
    std::vector<float> wave(samples);
    for (std::size_t i = 0; i < samples; ++i)
        wave[i] = static_cast<float>(
            0.5 * std::sin(2.0 * M_PI * 1000.0 / 48000.0 * static_cast<double>(i)));
    return wave;
}

std::int64_t write_audio(const audio_file::config& wanted, std::span<const float> samples,
                         std::size_t cut = 1000,
                         std::optional<std::int64_t> expected = std::nullopt) {
    audio_file file{wanted};
    if (expected)
        file.expect(*expected);
    for (std::size_t done = 0; done < samples.size(); done += cut)
        file.add(samples.subspan(done, std::min(cut, samples.size() - done)));
    file.finish();
    return file.clipped_samples();
}

std::uint64_t little_endian(const std::string& bytes, std::size_t at, std::size_t count) {
    std::uint64_t value = 0;
    for (std::size_t i = count; i-- > 0;)
        value = (value << 8) | static_cast<unsigned char>(bytes[at + i]);
    return value;
}

TEST(AudioFile, TakesItsContainerFromTheName) {
    EXPECT_EQ(audio_container_of("a.wav"), audio_container::wav);
    EXPECT_EQ(audio_container_of("a.b.FLAC"), audio_container::flac);
    for (const char* name : {"a.mp3", "a", "-", "wav", "a.wav.gz"})
        EXPECT_EQ(caught([&] { (void)audio_container_of(name); }).kind, fault::bad_request) << name;
}

TEST(AudioFile, KnowsItsSampleKindsByName) {
    EXPECT_EQ(parse_audio_sample("pcm16", "--sample"), audio_sample::pcm16);
    EXPECT_EQ(parse_audio_sample("pcm24", "--sample"), audio_sample::pcm24);
    EXPECT_EQ(parse_audio_sample("float", "--sample"), audio_sample::float32);
    EXPECT_TRUE(
        caught([] { (void)parse_audio_sample("pcm42", "--sample"); }).says("did you mean pcm"));
}

TEST(AudioFile, RefusesWhatTheContainerCannotHold) {
    const test::temporary_folder folder;
    EXPECT_EQ(caught([&] {
                  audio_file file{{.target = folder / "a.flac", .sample = audio_sample::float32}};
              }).kind,
              fault::bad_request);
    for (const double rate : {0.0, 44100.5, 1e6, std::nan("")})
        EXPECT_EQ(
            caught([&] { audio_file file{{.target = folder / "a.wav", .rate_hz = rate}}; }).kind,
            fault::bad_request)
            << rate;
    EXPECT_TRUE(fs::is_empty(folder.path()));
}

// The RIFF form: 44 bytes before the samples of plain PCM (Microsoft/IBM multimedia interface 1.0;
// from memory).
TEST(AudioFile, ScalesByTwoToTheBitsAndClampsAndCountsWhatIsBeyond) {
    const test::temporary_folder folder;
    const std::vector<float> samples{0.0F, 0.5F, -1.0F, 1.0F, 1.5F, -1.0001F, 1.0F / 32768.0F};
    EXPECT_EQ(write_audio({.target = folder / "a.wav"}, samples), 2);
    const std::string bytes = test::read_file(folder / "a.wav");
    ASSERT_EQ(bytes.substr(0, 4), "RIFF"); // not RF64 below 4 GiB
    const std::size_t data = bytes.size() - 2 * samples.size();
    EXPECT_EQ(bytes.substr(data - 8, 4), "data");
    const std::vector<int> expected{0, 16384, -32768, 32767, 32767, -32768, 1};
    for (std::size_t i = 0; i < expected.size(); ++i)
        EXPECT_EQ(static_cast<std::int16_t>(little_endian(bytes, data + 2 * i, 2)), expected[i])
            << i;
}

TEST(AudioFile, KeepsFloatsAsTheyAreWithoutAPeakChunk) {
    const test::temporary_folder folder;
    const std::vector<float> samples{0.25F, -1.75F};
    for (const auto length : {std::optional<std::int64_t>{2}, std::optional<std::int64_t>{}}) {
        const audio_file::config wanted{
            .target = folder / "a.wav", .sample = audio_sample::float32, .force = true};
        EXPECT_EQ(write_audio(wanted, samples, 1000, length), 0);
        const std::string bytes = test::read_file(folder / "a.wav");
        EXPECT_EQ(bytes.find("PEAK"), bytes.npos);
        EXPECT_EQ(std::bit_cast<float>(
                      static_cast<std::uint32_t>(little_endian(bytes, bytes.size() - 4, 4))),
                  -1.75F);
    }
}

// Format tags: 1 is PCM, 0xFFFE the extensible form (WAVEFORMATEX; from memory).
TEST(AudioFile, IsPlainWavWhereTheLengthIsKnownToFit) {
    const test::temporary_folder folder;
    const auto format_tag = [&](std::optional<std::int64_t> length) {
        write_audio({.target = folder / "a.wav", .force = true}, tone(100), 1000, length);
        const std::string bytes = test::read_file(folder / "a.wav");
        EXPECT_EQ(bytes.substr(0, 4), "RIFF");
        return little_endian(bytes, bytes.find("fmt ") + 8, 2);
    };
    EXPECT_EQ(format_tag(100), 1U);
    EXPECT_EQ(format_tag(3'000'000'000), 0xFFFEU); // RF64 taken back
    EXPECT_EQ(format_tag(std::nullopt), 0xFFFEU);
}

TEST(AudioFile, GivesEqualBytesHoweverTheAudioIsCut) {
    const test::temporary_folder folder;
    const auto wave = tone(20'000);
    for (const char* ending : {"wav", "flac"}) {
        const fs::path a = folder / fmt::format("a.{}", ending),
                       b = folder / fmt::format("b.{}", ending);
        write_audio({.target = a, .sample = audio_sample::pcm24}, wave, 7);
        write_audio({.target = b, .sample = audio_sample::pcm24}, wave, 20'000);
        EXPECT_EQ(test::read_file(a), test::read_file(b)) << ending;
    }
}

TEST(AudioFile, LeavesNothingWithoutFinish) {
    const test::temporary_folder folder;
    {
        audio_file file{{.target = folder / "a.wav"}};
        file.add(tone(1000));
    }
    EXPECT_TRUE(fs::is_empty(folder.path()));
}

TEST(AudioFile, LeavesNothingWhenTheDiskRefusesTheRest) {
    for (const char* name : {"a.wav", "a.flac"}) {
        const test::temporary_folder folder;
        rlimit before{};
        ::getrlimit(RLIMIT_FSIZE, &before);
        rlimit limit = before;
        limit.rlim_cur = 20'000;
        const auto handler = std::signal(SIGXFSZ, SIG_IGN);
        ::setrlimit(RLIMIT_FSIZE, &limit);
        const auto failure = caught([&] {
            write_audio({.target = folder / name, .sample = audio_sample::pcm24}, tone(48'000));
        });
        ::setrlimit(RLIMIT_FSIZE, &before);
        std::signal(SIGXFSZ, handler);
        EXPECT_EQ(failure.kind, fault::unwritable) << name;
        EXPECT_TRUE(failure.says("File too large")) << failure.line;
        EXPECT_TRUE(fs::is_empty(folder.path())) << name;
    }
}

TEST(AudioFile, NoticesAFailureThatComesOnlyWhileClosing) {
    const test::temporary_folder folder;
    rlimit before{};
    ::getrlimit(RLIMIT_FSIZE, &before);
    rlimit limit = before;
    const auto handler = std::signal(SIGXFSZ, SIG_IGN);
    const auto failure = caught([&] {
        audio_file file{{.target = folder / "a.flac"}};
        file.add(tone(1000)); // less than one FLAC block: nothing but the head is written yet
        limit.rlim_cur = 100;
        ::setrlimit(RLIMIT_FSIZE, &limit);
        file.finish();
    });
    ::setrlimit(RLIMIT_FSIZE, &before);
    std::signal(SIGXFSZ, handler);
    EXPECT_EQ(failure.kind, fault::unwritable);
    EXPECT_TRUE(fs::is_empty(folder.path()));
}

TEST(AudioFile, ReachesAFifoWithItsHeaderComplete) {
    const test::temporary_folder folder;
    const fs::path pipe = folder / "pipe.wav", file = folder / "file.wav";
    ASSERT_EQ(::mkfifo(pipe.c_str(), 0600), 0);
    std::string received;
    std::thread reader{[&] { received = test::read_file(pipe); }};
    write_audio({.target = pipe}, tone(10'000));
    reader.join();
    write_audio({.target = file}, tone(10'000));
    EXPECT_EQ(received, test::read_file(file));
}

// Outside truth: Python's wave module reads what was written.
TEST(OutsideAudioFile, IsReadByPythonsWaveModule) {
    const test::temporary_folder folder;
    write_audio({.target = folder / "a.wav", .rate_hz = 44100.0, .sample = audio_sample::pcm24},
                tone(5000), 1000, 5000);
    const std::string program = fmt::format(
        "import wave, math; w = wave.open('{}'); "
        "assert (w.getnchannels(), w.getsampwidth(), w.getframerate(), w.getnframes()) == (1, 3, "
        "44100, 5000); "
        "d = w.readframes(5000); "
        "v = [int.from_bytes(d[3*i:3*i+3], 'little', signed=True) / 2**23 for i in range(5000)]; "
        "assert max(abs(v[i] - 0.5*math.sin(2*math.pi*1000/48000*i)) for i in range(5000)) < 1e-7",
        (folder / "a.wav").string());
    const auto read = test::run_command(
        fmt::format("{} -c {}", TONEWALK_TEST_PYTHON, test::shell_quoted(program)));
    EXPECT_EQ(read.status, 0) << read.output;
}

// Outside truth: SoX decodes FLAC and WAV; a sine of amplitude 0.5 has an rms of 0.353553.
TEST(OutsideAudioFile, IsReadBySox) {
    if (test::run_command("sox --version").status != 0)
        GTEST_SKIP() << "SoX is missing";
    const test::temporary_folder folder;
    for (const char* name : {"a.wav", "a.flac"}) {
        write_audio({.target = folder / name}, tone(48'000));
        const auto read = test::run_command(
            fmt::format("sox {} -n stat", test::shell_quoted((folder / name).string())));
        EXPECT_EQ(read.status, 0) << read.output;
        EXPECT_NE(read.output.find("Length (seconds):      1.000000"), read.output.npos)
            << read.output;
        EXPECT_NE(read.output.find("RMS     amplitude:     0.353"), read.output.npos)
            << read.output;
        const std::string label = "Rough   frequency:";
        const std::size_t frequency = read.output.find(label);
        ASSERT_NE(frequency, read.output.npos) << read.output;
        EXPECT_NEAR(std::stod(read.output.substr(frequency + label.size())), 1000.0, 2.0);
    }
}
// EBU Tech 3306: RF64 with its sizes of 64 bits in a ds64 chunk; from memory.
TEST(SlowAudioFile, PassesFourGibibytesAsRf64) {
    const test::temporary_folder folder;
    if (fs::space(folder.path()).available < 6'000'000'000)
        GTEST_SKIP() << "no room for a file of 4.3 GB";
    constexpr std::int64_t seconds = 22'400;
    const auto second = tone(48'000);
    audio_file file{{.target = folder / "a.wav", .sample = audio_sample::float32}};
    for (std::int64_t done = 0; done < seconds; ++done)
        file.add(second);
    file.finish();
    std::ifstream written{folder / "a.wav", std::ios::binary};
    std::string head(256, '\0');
    written.read(head.data(), 256);
    EXPECT_EQ(head.substr(0, 4), "RF64");
    EXPECT_EQ(head.find("PEAK"), head.npos);
    const std::size_t sizes = head.find("ds64") + 8; // file, data and sample counts of 8 bytes each
    EXPECT_EQ(little_endian(head, sizes + 8, 8), static_cast<std::uint64_t>(4 * 48'000 * seconds));
    EXPECT_EQ(fs::file_size(folder / "a.wav"), little_endian(head, sizes, 8) + 8);
}

} // namespace
