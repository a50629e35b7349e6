// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/detect/audio_spool.hpp"

#include <csignal>
#include <filesystem>

#include <sys/resource.h>

#include <gtest/gtest.h>

#include "detect/signals.hpp"
#include "support/expect_error.hpp"
#include "support/temporary_folder.hpp"

namespace tonewalk {
namespace {

using namespace test;

TEST(AudioSpool, GivesBackWhatItGotFromAnyPlace) {
    const temporary_folder folder;
    const std::vector<float> audio = real_tone(100000, 48000.0, 777.7, 0.5);
    audio_spool spool{folder.path()};
    in_pieces<float>(audio, 3, [&](std::span<const float> piece) { spool.add(piece); });
    spool.close();
    ASSERT_EQ(spool.samples(), 100000);
    EXPECT_EQ(spool.peak(), 0.5F);
    std::vector<float> back(100000);
    spool.read(0, back);
    EXPECT_EQ(back, audio);
    std::vector<float> part(5);
    spool.read(99995, part);
    EXPECT_TRUE(std::equal(part.begin(), part.end(), audio.end() - 5));
}

TEST(AudioSpool, LeavesNoNameInTheFolder) {
    const temporary_folder folder;
    audio_spool spool{folder.path()};
    spool.add(std::vector<float>(50000, 1.0F));
    EXPECT_TRUE(std::filesystem::is_empty(folder.path()));
}

TEST(AudioSpool, SaysWhichFolderCannotTakeIt) {
    const auto failed = caught([] { audio_spool spool{"/nowhere/at/all"}; });
    EXPECT_EQ(failed.kind, fault::unwritable);
    EXPECT_TRUE(failed.says("/nowhere/at/all"));
    EXPECT_TRUE(failed.says("No such file"));
}

TEST(AudioSpool, KeepsAWriteThatFailedForTheClose) {
    const temporary_folder folder;
    rlimit before{};
    ASSERT_EQ(::getrlimit(RLIMIT_FSIZE, &before), 0);
    const auto handler = std::signal(SIGXFSZ, SIG_IGN);
    const rlimit small{.rlim_cur = 100000, .rlim_max = before.rlim_max};
    ASSERT_EQ(::setrlimit(RLIMIT_FSIZE, &small), 0); // as a full disk would
    audio_spool spool{folder.path()};
    spool.add(std::vector<float>(200000, 0.25F)); // must not throw
    const auto failed = caught([&] { spool.close(); });
    ::setrlimit(RLIMIT_FSIZE, &before);
    std::signal(SIGXFSZ, handler);
    EXPECT_EQ(failed.kind, fault::unwritable);
    EXPECT_TRUE(failed.says(folder.path().string()));
}

} // namespace
} // namespace tonewalk
