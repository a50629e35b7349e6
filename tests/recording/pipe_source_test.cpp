// SPDX-License-Identifier: GPL-3.0-or-later
#include <chrono>
#include <csignal>
#include <thread>

#include <sys/stat.h>
#include <unistd.h>

#include "recording_support.hpp"

namespace tonewalk {
namespace {

using test::caught;
using test::drain;
using test::error_of_opening;
using test::run_python;
using test::temporary_folder;
using namespace std::chrono_literals;

// Writes `bytes` into a pipe, `part` bytes a call, and closes it.
class feed {
public:
    feed(std::string bytes, std::size_t part) {
        std::array<int, 2> ends{};
        if (::pipe(ends.data()) != 0)
            throw std::runtime_error{"pipe"};
        read_end_ = ends[0];
        std::signal(SIGPIPE, SIG_IGN);
        writer_ = std::jthread{[bytes = std::move(bytes), part, end = ends[1]] {
            for (std::size_t at = 0; at < bytes.size(); at += part) {
                const std::size_t size = std::min(part, bytes.size() - at);
                if (::write(end, bytes.data() + at, size) < 0)
                    break;
            }
            ::close(end);
        }};
    }
    ~feed() { ::close(read_end_); }
    int read_end() const { return read_end_; }

private:
    std::jthread writer_;
    int read_end_ = -1;
};

recording_request pipe_request(int descriptor) {
    recording_request request;
    request.path = "-";
    request.pipe_descriptor = descriptor;
    request.format = parse_sample_format("ci16_le");
    request.rate_hz = 1000.0;
    return request;
}

std::string ramp_bytes(int count) {
    const temporary_folder folder;
    run_python(folder.path(), "open('x', 'wb').write(b''.join(struct.pack('<2h', n, -n) "
                              "for n in range(" +
                                  std::to_string(count) + ")))");
    return test::read_file(folder / "x");
}

std::vector<cf32> file_samples(const std::string& bytes, const recording_request& like) {
    const temporary_folder folder;
    test::write_file(folder / "x.iq", bytes);
    recording_request request = like;
    request.path = (folder / "x.iq").string();
    return drain(*open_recording(request)).samples;
}

TEST(PipeSource, GivesTheSameSamplesAsAFileInReadsOfAnySize) {
    const std::string bytes = ramp_bytes(5000);
    const auto expected = file_samples(bytes, pipe_request(0));
    for (const std::size_t part : {1U, 7U, 4093U}) {
        const feed pipe{bytes, part};
        const auto source = open_recording(pipe_request(pipe.read_end()));
        EXPECT_FALSE(source->facts().seekable);
        EXPECT_FALSE(source->facts().samples());
        const auto all = drain(*source, 300, 41);
        EXPECT_EQ(all.samples, expected);
        for (const auto& block : all.blocks)
            EXPECT_EQ(block.ends_stretch, &block == &all.blocks.back());
        EXPECT_TRUE(source->facts().notes.all().empty());
    }
}

TEST(PipeSource, ReplaysTheOpeningAndFollowsCuts) {
    const std::string bytes = ramp_bytes(2000);
    for (const auto& [from, until, opening] :
         {std::tuple{0.0, 2.0, 500U}, std::tuple{0.25, 1.5, 1U}, std::tuple{1.9, 9.0, 3000U},
          std::tuple{0.5, 1.0, 500U}, std::tuple{0.0, 9.0, 2000U}}) {
        const feed pipe{bytes, 611};
        auto request = pipe_request(pipe.read_end());
        request.from = from;
        request.until = until;
        const auto expected = file_samples(bytes, request);
        const auto source = open_recording(request);
        const auto start = source->opening(opening);
        const std::size_t kept = std::min<std::size_t>(opening, expected.size());
        ASSERT_EQ(start.size(), 4 * kept);
        std::vector<cf32> first(kept);
        sample_converter{source->facts()}.convert(start, first);
        EXPECT_TRUE(std::equal(first.begin(), first.end(), expected.begin()));
        const auto all = drain(*source, 100, 13);
        EXPECT_EQ(all.samples, expected);
        EXPECT_EQ(all.blocks.front().first, std::llround(from * 1000));
        EXPECT_TRUE(all.blocks.back().ends_stretch);
    }
}

TEST(PipeSource, AnEndAtABlocksEdgeIsToldByAnEmptyBlock) {
    const feed pipe{ramp_bytes(200), 4096};
    const auto source = open_recording(pipe_request(pipe.read_end()));
    const auto all = drain(*source, 100, 0);
    ASSERT_EQ(all.blocks.size(), 3U);
    EXPECT_EQ(all.blocks.back().count, 0U);
    EXPECT_TRUE(all.blocks.back().ends_stretch);
}

TEST(PipeSource, APartialLastSampleIsLeftOutAndNoted) {
    const feed pipe{ramp_bytes(50) + "xyz", 7};
    const auto source = open_recording(pipe_request(pipe.read_end()));
    EXPECT_EQ(drain(*source).samples.size(), 50U);
    EXPECT_TRUE(source->facts().notes.has(note_code::odd_tail));
}

TEST(PipeSource, WakeEndsAClaimThatWaits) {
    std::array<int, 2> ends{};
    ASSERT_EQ(::pipe(ends.data()), 0);
    const auto source = open_recording(pipe_request(ends[0]));
    std::vector<std::byte> slot(400);
    const auto start = std::chrono::steady_clock::now();
    {
        const std::jthread waker{[&] {
            std::this_thread::sleep_for(50ms);
            source->wake();
        }};
        EXPECT_FALSE(source->claim(slot, 0)); // nobody ever writes
    }
    EXPECT_GE(std::chrono::steady_clock::now() - start, 50ms);
    EXPECT_FALSE(source->claim(slot, 0));
    ::close(ends[0]);
    ::close(ends[1]);
}

TEST(PipeSource, WakeEndsAnOpeningThatWaitsAndWhatCameOfItIsHandedOut) {
    std::array<int, 2> ends{};
    ASSERT_EQ(::pipe(ends.data()), 0);
    const std::string bytes = ramp_bytes(250) + "xyz";
    ASSERT_EQ(::write(ends[1], bytes.data(), bytes.size()), std::ssize(bytes));
    const auto source = open_recording(pipe_request(ends[0]));
    const std::jthread waker{[&] {
        std::this_thread::sleep_for(50ms);
        source->wake();
    }};
    EXPECT_EQ(source->opening(1000).size(), 250 * source->facts().frame_bytes());
    const auto all = drain(*source, 100, 7);
    EXPECT_EQ(all.samples, file_samples(ramp_bytes(250), pipe_request(0)));
    EXPECT_TRUE(all.blocks.back().ends_stretch);
    ::close(ends[0]);
    ::close(ends[1]);
}

TEST(PipeSource, ANamedPipeIsReadLikeOne) {
    const temporary_folder folder;
    const std::filesystem::path path = folder / "fifo";
    ASSERT_EQ(::mkfifo(path.c_str(), 0600), 0);
    const std::string bytes = ramp_bytes(1000);
    auto request = pipe_request(0);
    request.path = path.string();
    const auto source = open_recording(request);
    const std::jthread writer{[&] { test::write_file(path, bytes); }};
    EXPECT_EQ(drain(*source).samples, file_samples(bytes, pipe_request(0)));
}

TEST(MalformedPipe, WithoutFormatOrRateTheCommandLineIsWrong) {
    for (const bool with_format : {false, true}) {
        auto request = pipe_request(0);
        with_format ? request.rate_hz.reset() : request.format.reset();
        const auto failure = error_of_opening(request);
        EXPECT_EQ(failure.exit_status, 2);
        EXPECT_TRUE(failure.says("standard input")) << failure.line;
        EXPECT_TRUE(failure.says(with_format ? "--rate" : "--format")) << failure.line;
    }
}

TEST(MalformedPipe, VerifyAndLanesAreRefused) {
    auto request = pipe_request(0);
    request.verify = true;
    EXPECT_EQ(error_of_opening(request).exit_status, 2);
    request.verify = false;
    request.lane = 3;
    EXPECT_EQ(error_of_opening(request).exit_status, 3);
}

TEST(MalformedPipe, ThatEndsBeforeItsFirstSampleIsAnError) {
    for (const std::string bytes : {"", "xyz"}) {
        const feed pipe{bytes, 4096};
        const auto source = open_recording(pipe_request(pipe.read_end()));
        const auto failure = caught([&] { (void)source->opening(100); });
        EXPECT_EQ(failure.exit_status, 3);
        EXPECT_TRUE(failure.says("holds no samples")) << failure.line;
    }
    const feed pipe{"", 1};
    const auto source = open_recording(pipe_request(pipe.read_end()));
    std::vector<std::byte> slot(400);
    EXPECT_TRUE(caught([&] { (void)source->claim(slot, 0); }).says("holds no samples"));
}

TEST(MalformedPipe, ThatEndsBeforeFromIsAnError) {
    for (const int samples : {10, 1000}) {
        const feed pipe{ramp_bytes(samples), 4096};
        auto request = pipe_request(pipe.read_end());
        request.from = 1.0;
        const auto source = open_recording(request);
        const auto failure = caught([&] { (void)source->opening(100); });
        EXPECT_EQ(failure.exit_status, 3);
        EXPECT_TRUE(failure.says("before --from 1 s")) << failure.line;
    }
}

TEST(MalformedPipe, ADescriptorThatCannotBeReadIsAnError) {
    const auto source = open_recording(pipe_request(9999));
    std::vector<std::byte> slot(400);
    const auto failure = caught([&] { (void)source->claim(slot, 0); });
    EXPECT_EQ(failure.kind, fault::unreadable);
    EXPECT_TRUE(failure.says("cannot be read")) << failure.line;
}

} // namespace
} // namespace tonewalk
