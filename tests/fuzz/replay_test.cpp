// SPDX-License-Identifier: GPL-3.0-or-later
// The inputs that fuzzing starts from, and every one that it ever failed on.
#include <algorithm>
#include <filesystem>
#include <vector>

#include <gtest/gtest.h>

#include "support/temporary_folder.hpp"
#include "targets.hpp"

namespace {

namespace fs = std::filesystem;
using namespace tonewalk;

std::vector<fs::path> files_in(const fs::path& folder) {
    if (!fs::exists(folder))
        return {};
    std::vector<fs::path> files{fs::directory_iterator{folder}, fs::directory_iterator{}};
    std::sort(files.begin(), files.end());
    return files;
}

// How many of the folder's files are accepted; each is read, whatever becomes of the others.
std::ptrdiff_t accepted_of(const std::vector<fs::path>& files, bool target(fuzz::input)) {
    return std::count_if(files.begin(), files.end(), [&](const fs::path& file) {
        const std::string text = test::read_file(file);
        bool accepted = false;
        EXPECT_NO_THROW(accepted = target(std::as_bytes(std::span{text}))) << file;
        return accepted;
    });
}

void replay(const std::string& name, bool target(fuzz::input)) {
    const fs::path root = TONEWALK_FUZZ_INPUTS;
    const auto corpus = files_in(root / "corpus" / name);
    const auto accepted = accepted_of(corpus, target);
    EXPECT_GT(accepted, 0) << "no input gets through to the end";
    EXPECT_LT(accepted, std::ssize(corpus)) << "no input is refused";
    (void)accepted_of(files_in(root / "crashes" / name), target);
}

TEST(MalformedFuzzInputs, AsMetadataKeepEveryPromise) {
    replay("metadata", fuzz::metadata);
}
TEST(MalformedFuzzInputs, AsAnArchiveKeepEveryPromise) {
    replay("archive", fuzz::archive);
}
TEST(MalformedFuzzInputs, AsAContainerKeepEveryPromise) {
    replay("container", fuzz::container);
}
TEST(MalformedFuzzInputs, AsASceneKeepEveryPromise) {
    replay("scene_text", fuzz::scene_text);
}

} // namespace
