// SPDX-License-Identifier: GPL-3.0-or-later
#include <array>
#include <chrono>
#include <future>
#include <thread>

#include <gtest/gtest.h>
#include <unistd.h>

#include "pass_support.hpp"
#include "support/temporary_folder.hpp"

namespace tonewalk::test {
namespace {

constexpr double rate_hz = 2.4e6;
constexpr std::size_t all_samples = 1'500'000;
const channel_plan carrier{300e3, false, 20e3};

const std::vector<cf32>& samples() {
    static const auto made = carrier_in_noise(300e3, rate_hz, all_samples);
    return made;
}

memory_source source_of(std::size_t count) {
    return {facts_of("cf32_le", rate_hz, count), bytes_of(samples())};
}

outcome run(block_source& source, unsigned threads, std::stop_token stop = {}) {
    run_control control;
    control.threads = threads;
    control.stop = std::move(stop);
    return run_through(source, carrier, control, {65'536});
}

/// A recording that simply ends after so many samples.
outcome cut_at(sample_index count) {
    memory_source source = source_of(static_cast<std::size_t>(count));
    return run(source, 1);
}

TEST(StoppedPass, EqualsTheRecordingCutWhereItStopped) {
    for (const unsigned threads : {1U, 2U, 7U}) {
        SCOPED_TRACE(threads);
        memory_source source = source_of(all_samples);
        std::stop_source stop;
        source.on_claim(700'000, [&stop] { stop.request_stop(); });
        const outcome part = run(source, threads, stop.get_token());
        EXPECT_EQ(part.report.end, pass_end::stopped);
        EXPECT_GT(part.report.samples, 690'000); // the claimed block is drained
        EXPECT_LT(part.report.samples, 720'000);
        EXPECT_TRUE(part.heard.finished);
        expect_same(part, cut_at(part.report.samples));
    }
}

TEST(StoppedPass, RequestBeforeTheFirstBlockMeasuresNothing) {
    memory_source source = source_of(all_samples);
    std::stop_source stop;
    stop.request_stop();
    const outcome none = run(source, 2, stop.get_token());
    EXPECT_EQ(none.report.end, pass_end::stopped);
    EXPECT_EQ(none.report.samples, 0);
    EXPECT_TRUE(none.heard.finished);
    EXPECT_TRUE(none.heard.stretches.empty());
}

TEST(StoppedPass, RequestDuringTheLastBlockIsTooLateToCutAnything) {
    memory_source source = source_of(all_samples);
    std::stop_source stop;
    source.on_claim(all_samples - 1, [&stop] { stop.request_stop(); });
    const outcome whole = run(source, 2, stop.get_token());
    EXPECT_EQ(whole.report.end, pass_end::complete);
    EXPECT_EQ(whole.report.samples, static_cast<sample_index>(all_samples));
}

/// A pipe whose writer keeps it open.
class idle_pipe {
public:
    idle_pipe() { EXPECT_EQ(::pipe(ends_.data()), 0); }
    idle_pipe(const idle_pipe&) = delete;
    idle_pipe& operator=(const idle_pipe&) = delete;
    ~idle_pipe() {
        close_writer();
        ::close(ends_[0]);
    }
    [[nodiscard]] int reader() const { return ends_[0]; }
    void write(std::span<const std::byte> bytes) const {
        while (!bytes.empty()) {
            const ::ssize_t part = ::write(ends_[1], bytes.data(), bytes.size());
            ASSERT_GT(part, 0);
            bytes = bytes.subspan(static_cast<std::size_t>(part));
        }
    }
    void close_writer() {
        if (ends_[1] >= 0) {
            ::close(ends_[1]);
        }
        ends_[1] = -1;
    }

private:
    std::array<int, 2> ends_{-1, -1};
};

std::unique_ptr<block_source> open_pipe(const idle_pipe& pipe) {
    recording_request request;
    request.path = "-";
    request.format = parse_sample_format("cf32_le");
    request.rate_hz = rate_hz;
    request.pipe_descriptor = pipe.reader();
    return open_recording(request);
}

TEST(StoppedPass, StopWakesAPipeThatIsIdle) {
    for (const unsigned threads : {1U, 2U, 7U}) {
        SCOPED_TRACE(threads);
        idle_pipe pipe;
        const auto source = open_pipe(pipe);
        std::stop_source stop;
        auto running =
            std::async(std::launch::async, [&] { return run(*source, threads, stop.get_token()); });
        pipe.write(std::as_bytes(std::span{samples()}.first(200'000)));
        EXPECT_EQ(running.wait_for(std::chrono::milliseconds{300}), std::future_status::timeout);
        stop.request_stop();
        const bool woken = running.wait_for(std::chrono::seconds{20}) == std::future_status::ready;
        pipe.close_writer(); // wakes it in any case, so that a failure is no hang
        ASSERT_TRUE(woken);
        const outcome part = running.get();
        EXPECT_EQ(part.report.end, pass_end::stopped);
        EXPECT_GT(part.report.samples, 190'000); // all but the block that was being filled
        EXPECT_LE(part.report.samples, 200'000);
        expect_same(part, cut_at(part.report.samples));
    }
}

TEST(SinglePass, PipeAndFileGiveTheSameBits) {
    const temporary_folder folder;
    const auto bytes = std::as_bytes(std::span{samples()});
    write_file(folder / "recording.cf32",
               {reinterpret_cast<const char*>(bytes.data()), bytes.size()});
    recording_request request;
    request.path = (folder / "recording.cf32").string();
    request.format = parse_sample_format("cf32_le");
    request.rate_hz = rate_hz;
    const auto file = open_recording(request);
    const outcome from_file = run(*file, 2);

    idle_pipe pipe;
    const auto source = open_pipe(pipe);
    std::jthread writer{[&] {
        pipe.write(bytes);
        pipe.close_writer();
    }};
    source->opening(100'000); // read once, replayed
    const outcome from_pipe = run(*source, 3);
    EXPECT_EQ(from_pipe.report.end, pass_end::complete);
    EXPECT_EQ(from_pipe.report.samples, static_cast<sample_index>(all_samples));
    expect_same(from_file, from_pipe);
}

TEST(FailedPass, WhatCameBeforeIsMeasuredAndTheReasonKept) {
    for (const unsigned threads : {1U, 2U, 7U}) {
        SCOPED_TRACE(threads);
        memory_source source = source_of(all_samples);
        source.fail_at(800'000, std::chrono::milliseconds{50}); // later blocks are ready by then
        const outcome part = run(source, threads);
        EXPECT_EQ(part.report.end, pass_end::input_failed);
        EXPECT_EQ(part.report.failure, "memory: cannot be read; read it again");
        EXPECT_GT(part.report.samples, 790'000); // up to the block that could not be read
        EXPECT_LE(part.report.samples, 800'000);
        EXPECT_TRUE(part.heard.finished);
        expect_same(part, cut_at(part.report.samples));
    }
}

TEST(FailedPass, SourceThatThrowsWhileItClaimsEndsThePassTheSameWay) {
    for (const unsigned threads : {1U, 3U}) {
        memory_source source = source_of(all_samples);
        source.on_claim(800'000, [] {
            throw error{fault::unreadable, "has gone", "memory", "find it"};
        });
        const outcome part = run(source, threads);
        EXPECT_EQ(part.report.end, pass_end::input_failed);
        EXPECT_EQ(part.report.failure, "memory: has gone; find it");
        EXPECT_GT(part.report.samples, 790'000);
        expect_same(part, cut_at(part.report.samples));
    }
}

} // namespace
} // namespace tonewalk::test
