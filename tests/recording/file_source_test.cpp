// SPDX-License-Identifier: GPL-3.0-or-later
// The contract of block_source, for files.
#include <atomic>
#include <thread>

#include "recording_support.hpp"

namespace tonewalk {
namespace {

using test::caught;
using test::drain;
using test::run_python;
using test::temporary_folder;

recording_request raw_request(const temporary_folder& folder, const char* name = "x.iq") {
    recording_request request;
    request.path = (folder / name).string();
    request.format = parse_sample_format("ci16_le");
    request.rate_hz = 1000.0;
    return request;
}

// Frame n is (n, n + 1).
void write_ramp(const temporary_folder& folder, int count) {
    run_python(folder.path(), "open('x.iq', 'wb').write(b''.join(struct.pack('<2h', n, n + 1) "
                              "for n in range(" +
                                  std::to_string(count) + ")))");
}

TEST(FileSource, BlocksAreTheSameSamplesWhateverTheSlotAndTheLead) {
    const temporary_folder folder;
    write_ramp(folder, 1000);
    const auto whole = drain(*open_recording(raw_request(folder)), 2000).samples;
    ASSERT_EQ(whole.size(), 1000U);
    for (const auto& [slot, lead] : {std::pair{1U, 0U}, std::pair{7U, 6U}, std::pair{64U, 33U},
                                     std::pair{1000U, 0U}, std::pair{1001U, 1U}}) {
        const auto parts = drain(*open_recording(raw_request(folder)), slot, lead);
        EXPECT_EQ(parts.samples, whole);
        for (const auto& block : parts.blocks)
            EXPECT_EQ(block.ends_stretch, &block == &parts.blocks.back());
        EXPECT_EQ(parts.blocks.front().count, std::min(slot - lead, 1000U))
            << "the first block's room for a lead stays empty";
    }
}

TEST(FileSource, BlocksMayBeFilledByManyThreadsInAnyOrder) {
    const temporary_folder folder;
    write_ramp(folder, 30000);
    const auto source = open_recording(raw_request(folder));
    std::vector<std::vector<std::byte>> slots;
    std::vector<raw_block> blocks;
    while (true) {
        slots.emplace_back(4 * 500);
        const auto block = source->claim(slots.back(), 100);
        if (!block)
            break;
        blocks.push_back(*block);
    }
    std::atomic<std::size_t> next = 0;
    const auto work = [&] {
        for (std::size_t k = next++; k < blocks.size(); k = next++)
            source->fill(blocks[blocks.size() - 1 - k]);
    };
    { std::jthread one{work}, two{work}, three{work}; }
    sample_index expected = 0;
    for (const auto& block : blocks) {
        std::vector<cf32> samples(block.lead + block.count);
        sample_converter{source->facts()}.convert(block.bytes, samples);
        const sample_index first = block.first - static_cast<sample_index>(block.lead);
        for (std::size_t n = 0; n < samples.size(); ++n)
            ASSERT_EQ(samples[n].real() * 32768.0F,
                      static_cast<float>(first) + static_cast<float>(n));
        EXPECT_EQ(block.first, expected);
        expected += static_cast<sample_index>(block.count);
    }
    EXPECT_EQ(expected, 30000);
}

TEST(FileSource, OpeningAndProbesLeaveTheBlocksAlone) {
    const temporary_folder folder;
    write_ramp(folder, 1000);
    auto request = raw_request(folder);
    request.from = 0.1;
    const auto source = open_recording(request);
    const auto opening = source->opening(50);
    ASSERT_EQ(opening.size(), 200U);
    EXPECT_EQ(opening[0], std::byte{100});
    std::vector<std::byte> bytes(4 * 20);
    EXPECT_EQ(source->probe(990, bytes), 10U);
    EXPECT_EQ(source->probe(99, bytes), 0U) << "before what is to be measured";
    EXPECT_EQ(source->probe(1000, bytes), 0U);
    EXPECT_EQ(source->opening(5000).size(), 900 * 4U);
    EXPECT_EQ(drain(*source).samples.size(), 900U);
}

TEST(FileSource, WakeEndsClaims) {
    const temporary_folder folder;
    write_ramp(folder, 1000);
    const auto source = open_recording(raw_request(folder));
    std::vector<std::byte> slot(400);
    EXPECT_TRUE(source->claim(slot, 0));
    source->wake();
    EXPECT_FALSE(source->claim(slot, 0));
}

TEST(MalformedRaw, AFileThatShrinksMeanwhileIsAnErrorThatNamesTheByte) {
    const temporary_folder folder;
    write_ramp(folder, 1000);
    const auto source = open_recording(raw_request(folder));
    std::vector<std::byte> slot(4 * 100);
    auto first = source->claim(slot, 0);
    source->fill(*first);
    std::filesystem::resize_file(folder / "x.iq", 500);
    auto second = source->claim(slot, 0);
    const auto failure = caught([&] { source->fill(*second); });
    EXPECT_EQ(failure.kind, fault::unreadable);
    EXPECT_EQ(failure.exit_status, 3);
    EXPECT_TRUE(failure.says("x.iq, byte 500: ends here")) << failure.line;
    EXPECT_EQ(failure.line.find('\n'), failure.line.npos);
}

} // namespace
} // namespace tonewalk
