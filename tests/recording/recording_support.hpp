// SPDX-License-Identifier: GPL-3.0-or-later
// Recordings for tests: their bytes come from Python's struct, tarfile and wave modules or from
// SoX, never from the code under test.
#pragma once

#include <algorithm>
#include <filesystem>
#include <span>
#include <stdexcept>
#include <string>
#include <vector>

#include <gtest/gtest.h>

#include "support/expect_error.hpp"
#include "support/run_command.hpp"
#include "support/temporary_folder.hpp"
#include "tonewalk/recording/convert.hpp"
#include "tonewalk/recording/stream.hpp"

namespace tonewalk::test {

/// Runs Python code in that folder, with the modules that write recordings imported.
inline void run_python(const std::filesystem::path& folder, const std::string& code) {
    const std::string script = "import hashlib, io, json, os, struct, tarfile, wave\n" + code;
    const auto result = run_command("cd " + shell_quoted(folder.string()) + " && " +
                                    TONEWALK_TEST_PYTHON + " -c " + shell_quoted(script));
    if (result.status != 0)
        throw std::runtime_error{"python: " + result.output};
}

/// Python code that defines meta(name, datatype, captures=[...], **global fields without "core:").
inline const std::string define_meta = R"(
def meta(name, datatype='ci16_le', captures=({'core:sample_start': 0},), rate=48000, **fields):
    head = {'core:datatype': datatype, 'core:version': '1.2.5'}
    if rate: head['core:sample_rate'] = rate
    head.update({'core:' + key: value for key, value in fields.items()})
    text = json.dumps({'global': head, 'captures': list(captures), 'annotations': []})
    if name: open(name + '.sigmf-meta', 'w').write(text)
    return text.encode()
)";

struct drained {
    std::vector<cf32> samples;
    std::vector<raw_block> blocks; ///< their bytes are gone
};

/// Reads a source to its end in slots of that many frames, and checks that every lead repeats the
/// samples before it.
inline drained drain(block_source& source, std::size_t slot_frames = 64, std::size_t lead = 0) {
    drained all;
    const stream_facts& facts = source.facts();
    const sample_converter converter{facts};
    std::vector<std::byte> slot(slot_frames * facts.frame_bytes());
    std::size_t stretch_start = 0;
    std::uint32_t stretch = 0;
    while (auto block = source.claim(slot, lead)) {
        source.fill(*block);
        if (block->stretch != stretch)
            stretch_start = all.samples.size();
        stretch = block->stretch;
        std::vector<cf32> samples(block->lead + block->count);
        converter.convert(block->bytes, samples);
        const std::size_t before = all.samples.size() - stretch_start;
        EXPECT_EQ(block->lead, std::min(lead, before));
        EXPECT_TRUE(std::equal(samples.begin(),
                               samples.begin() + static_cast<std::ptrdiff_t>(block->lead),
                               all.samples.end() - static_cast<std::ptrdiff_t>(block->lead)));
        all.samples.insert(all.samples.end(),
                           samples.begin() + static_cast<std::ptrdiff_t>(block->lead),
                           samples.end());
        all.blocks.push_back(*block);
        all.blocks.back().bytes = {};
    }
    return all;
}

inline drained read_recording(const recording_request& request) {
    return drain(*open_recording(request));
}

/// The error of opening; a line feed in it fails the test.
inline caught_error error_of_opening(const recording_request& request) {
    const caught_error failure = caught([&] { (void)open_recording(request); });
    EXPECT_TRUE(failure.kind.has_value()) << "nothing was thrown";
    EXPECT_EQ(failure.line.find('\n'), failure.line.npos) << failure.line;
    return failure;
}

} // namespace tonewalk::test
