// SPDX-License-Identifier: GPL-3.0-or-later
// Sound containers written by Python or SoX. Codes are small numbers, so that every depth shows its
// own bits.
#include "recording_support.hpp"

namespace tonewalk {
namespace {

using test::drain;
using test::drained;
using test::error_of_opening;
using test::read_recording;
using test::run_command;
using test::run_python;
using test::shell_quoted;
using test::temporary_folder;

// wav(name, bits, count): frame n holds codes n - 50 (left) and 3 - n (right); `tag` 3 is float.
const std::string define_wav = R"(
def code(value, bits, tag=1):
    if tag == 3: return struct.pack('<f' if bits == 32 else '<d', value / 128)
    if bits == 8: return struct.pack('<B', value + 128)
    return struct.pack('<i', value)[:bits // 8] if value >= 0 else struct.pack('<i', value)[:bits // 8]
def samples(bits, count, channels=2, tag=1):
    return b''.join(code(n - 50, bits, tag) + (code(3 - n, bits, tag) if channels == 2 else b'')
                    for n in range(count))
def fmt(bits, channels=2, tag=1, rate=48000):
    frame = channels * bits // 8
    return struct.pack('<HHIIHH', tag, channels, rate, rate * frame, frame, bits)
def chunk(name, content, size=None):
    return name + struct.pack('<I', len(content) if size is None else size) + content + bytes(len(content) % 2)
def riff(name, chunks, size=None, kind=b'RIFF'):
    body = b'WAVE' + b''.join(chunks)
    open(name, 'wb').write(kind + struct.pack('<I', len(body) if size is None else size) + body)
def wav(name, bits, count=100, channels=2, tag=1, size=None, after=b'', before=b''):
    riff(name, [chunk(b'fmt ', fmt(bits, channels, tag)), before,
                chunk(b'data', samples(bits, count, channels, tag), size), after])
)";

// What frames of `define_wav` read as, when codes count from 2^-(bits-1).
std::vector<cf32> frames(std::size_t count, float step, bool complex = true) {
    std::vector<cf32> expected;
    for (int n = 0; n < static_cast<int>(count); ++n) {
        const float left = static_cast<float>(n - 50) * step,
                    right = static_cast<float>(3 - n) * step;
        expected.push_back(complex ? cf32{left, right} : cf32{2.0F * left, 0.0F});
    }
    return expected;
}

recording_request request_for(const temporary_folder& folder, const std::string& name) {
    recording_request request;
    request.path = (folder / name).string();
    return request;
}

struct depth {
    const char* arguments;
    const char* format_name;
    const char* stored;
    unsigned code_bits;
    float step;
};

TEST(Container, WavIsReadInItsOwnDepth) {
    for (const depth& depth : {depth{"8", "wav pcm8", "u8", 8, 1.0F / 128},
                               depth{"16", "wav pcm16", "i16_le", 16, 1.0F / 32768},
                               depth{"24", "wav pcm24", "i32_le", 24, 1.0F / 8388608},
                               depth{"32", "wav pcm32", "i32_le", 32, 1.0F / 2147483648.0F},
                               depth{"32, tag=3", "wav float", "f32_le", 0, 1.0F / 128},
                               depth{"64, tag=3", "wav double", "f64_le", 0, 1.0F / 128}}) {
        const temporary_folder folder;
        const std::string arguments = depth.arguments;
        run_python(folder.path(), define_wav + "wav('two.wav', " + arguments +
                                      "); wav('one.wav', " + arguments + ", channels=1)");
        for (const bool complex : {true, false}) {
            const auto source =
                open_recording(request_for(folder, complex ? "two.wav" : "one.wav"));
            const stream_facts& facts = source->facts();
            EXPECT_EQ(facts.format_name, depth.format_name);
            EXPECT_EQ(facts.format.name(), (complex ? "c" : "r") + std::string{depth.stored});
            EXPECT_EQ(facts.code_bits, depth.code_bits);
            EXPECT_EQ(facts.sample_rate_hz, 48000.0);
            EXPECT_FALSE(facts.centre_hz);
            EXPECT_TRUE(facts.notes.all().empty());
            EXPECT_EQ(drain(*source, 16, 5).samples, frames(100, depth.step, complex))
                << depth.format_name;
        }
    }
}

TEST(Container, OpeningAndProbesOf24BitsAgreeWithBlocks) {
    const temporary_folder folder;
    run_python(folder.path(), define_wav + "wav('a.wav', 24)");
    const auto source = open_recording(request_for(folder, "a.wav"));
    const auto opening = source->opening(30);
    std::vector<std::byte> probed(8 * 40);
    EXPECT_EQ(source->probe(70, probed), 30U);
    std::vector<cf32> first(30), last(30);
    const sample_converter converter{source->facts()};
    converter.convert(opening, first);
    converter.convert(probed, last);
    const auto all = drain(*source).samples;
    EXPECT_TRUE(std::equal(first.begin(), first.end(), all.begin()));
    EXPECT_TRUE(std::equal(last.begin(), last.end(), all.begin() + 70));
}

TEST(Container, ValidBitsOfExtensibleHeadersSetTheCodeSteps) {
    const temporary_folder folder;
    run_python(folder.path(), define_wav + R"(
guid = struct.pack('<H', 1) + bytes.fromhex('000000001000800000aa00389b71')
head = fmt(32, tag=0xFFFE) + struct.pack('<HHI', 22, 24, 3) + guid
riff('x.wav', [chunk(b'fmt ', head), chunk(b'data', struct.pack('<4i', 256, 512, -256, 0))])
)");
    const auto source = open_recording(request_for(folder, "x.wav"));
    EXPECT_EQ(source->facts().code_bits, 24U);
    EXPECT_EQ(source->facts().format_name, "wav pcm32");
}

// SoX writes its own forms; no dither (-D), so that codes are kept.
TEST(OutsideSox, EveryKindOfContainerHoldsTheSameSamples) {
    if (run_command("sox --version").status != 0)
        GTEST_SKIP() << "sox is missing: containers other than WAV are not tested";
    const temporary_folder folder;
    run_python(folder.path(),
               "open('raw.s16', 'wb').write(b''.join("
               "struct.pack('<2h', 300 * n - 15000, 900 - 300 * n) for n in range(100)))");
    const auto expected = frames(100, 300.0F / 32768.0F);
    struct kind {
        const char* file;
        const char* options;
        const char* format_name;
    };
    for (const kind& kind :
         {kind{"a.wav", "-b 16", "wav pcm16"}, kind{"b.wav", "-b 24", "wav pcm24"},
          kind{"c.wav", "-b 32 -e float", "wav float"}, kind{"d.aiff", "-b 16", "aiff pcm16"},
          kind{"e.aiff", "-b 24", "aiff pcm24"}, kind{"f.aifc", "-b 16", "aiff pcm16"},
          kind{"g.au", "-b 16", "au pcm16"}, kind{"h.au", "-b 24", "au pcm24"},
          kind{"i.au", "-b 32 -e float", "au float"}, kind{"j.w64", "-b 16", "w64 pcm16"},
          kind{"k.w64", "-b 24", "w64 pcm24"}, kind{"l.caf", "-b 16", "caf pcm16"},
          kind{"m.caf", "-b 24", "caf pcm24"}, kind{"n.wav", "-b 16 -B", "wav pcm16"},
          kind{"o.flac", "-b 16", "flac pcm16"}, kind{"p.flac", "-b 24", "flac pcm24"},
          kind{"q.voc", "-b 16", "voc pcm16"}}) {
        const auto made = run_command("cd " + shell_quoted(folder.path().string()) +
                                      " && sox -D -t s16 -r 48000 -c 2 raw.s16 " + kind.options +
                                      " " + kind.file);
        ASSERT_EQ(made.status, 0) << made.output;
        const auto source = open_recording(request_for(folder, kind.file));
        EXPECT_EQ(source->facts().format_name, kind.format_name);
        EXPECT_TRUE(source->facts().notes.all().empty()) << kind.file;
        // Probes and the opening first, so that blocks must find their way back.
        std::vector<std::byte> probe(10 * source->facts().frame_bytes());
        EXPECT_EQ(source->probe(50, probe), 10U);
        EXPECT_EQ(source->opening(20).size(), 20 * source->facts().frame_bytes());
        EXPECT_EQ(drain(*source, 16, 5).samples, expected) << kind.file;
        auto request = request_for(folder, kind.file);
        request.from = 40 / 48000.0;
        const auto cut = read_recording(request).samples;
        EXPECT_TRUE(std::equal(cut.begin(), cut.end(), expected.begin() + 40, expected.end()))
            << kind.file;
    }
}

// Headers of streamed files: the count is open, and everything up to the file's end is read.
TEST(Container, OpenCountsAreReadToTheEnd) {
    const temporary_folder folder;
    run_python(folder.path(), define_wav + R"(
wav('zero.wav', 16, size=0)
wav('open.wav', 16, size=0xFFFFFFFF)
wav('zero24.wav', 24, size=0)
data = b''.join(struct.pack('>2h', n - 50, 3 - n) for n in range(100))
head = struct.pack('>4s5I', b'.snd', 24, 0xFFFFFFFF, 3, 48000, 2)
open('open.au', 'wb').write(head + data)
sizes = struct.pack('<QQQI', 0, 400, 100, 0)
riff('a.rf64', [b'ds64', struct.pack('<I', 28), sizes, chunk(b'fmt ', fmt(16)),
                chunk(b'data', samples(16, 100), 0xFFFFFFFF), chunk(b'LIST', b'INFO' + b'x' * 40)],
     0xFFFFFFFF, b'RF64')
)");
    for (const char* name : {"zero.wav", "open.wav", "open.au", "a.rf64"}) {
        const auto source = open_recording(request_for(folder, name));
        EXPECT_TRUE(source->facts().notes.all().empty()) << name;
        EXPECT_EQ(drain(*source).samples, frames(100, 1.0F / 32768)) << name;
    }
    EXPECT_EQ(read_recording(request_for(folder, "zero24.wav")).samples,
              frames(100, 1.0F / 8388608));
}

TEST(Container, OneShorterThanItsHeaderSaysIsMeasuredAsFarAsItGoes) {
    const temporary_folder folder;
    run_python(folder.path(), define_wav + R"(
wav('whole.wav', 16)
open('cut.wav', 'wb').write(open('whole.wav', 'rb').read()[:44 + 4 * 60 + 1])
wav('claims.wav', 16, size=0x7FFFF000)
)");
    const auto source = open_recording(request_for(folder, "cut.wav"));
    ASSERT_TRUE(source->facts().notes.has(note_code::container_short));
    EXPECT_TRUE(source->facts().notes.has(note_code::odd_tail));
    EXPECT_EQ(source->facts().notes.all()[0].text,
              "the header says 100 samples, the file holds 60");
    EXPECT_EQ(drain(*source).samples, frames(60, 1.0F / 32768));
    EXPECT_EQ(read_recording(request_for(folder, "claims.wav")).samples, frames(100, 1.0F / 32768));
}

TEST(Container, ChunksAroundTheSamplesAreNoSamples) {
    const temporary_folder folder;
    run_python(folder.path(), define_wav + R"(
note = chunk(b'LIST', b'INFO' + b'x' * 41)
wav('a.wav', 16, after=note)
wav('b.wav', 16, before=note)
wav('c.wav', 8, count=99, channels=1, after=note) # a pad byte between
)");
    for (const char* name : {"a.wav", "b.wav"}) {
        const auto source = open_recording(request_for(folder, name));
        EXPECT_TRUE(source->facts().notes.all().empty());
        EXPECT_EQ(drain(*source).samples, frames(100, 1.0F / 32768));
    }
    EXPECT_EQ(read_recording(request_for(folder, "c.wav")).samples, frames(99, 1.0F / 128, false));
}

// Over 4 GiB a 32-bit count wraps: a sparse file of 2^32 + 400 bytes of samples whose header says
// 400.
TEST(Container, ACountThatHasWrappedIsPutRight) {
    const temporary_folder folder;
    run_python(folder.path(), define_wav + R"(
with open('big.wav', 'wb') as file:
    file.write(b'RIFF' + struct.pack('<I', 436) + b'WAVE' + chunk(b'fmt ', fmt(16)) + b'data'
               + struct.pack('<I', 400))
    start = file.tell()
    file.write(samples(16, 100))
    file.seek(start + (1 << 32))
    file.write(samples(16, 100))
)");
    auto request = request_for(folder, "big.wav");
    constexpr sample_index frames_held = (sample_index{1} << 30) + 100;
    const auto source = open_recording(request);
    EXPECT_EQ(source->facts().samples(), frames_held);
    EXPECT_TRUE(source->facts().notes.has(note_code::metadata_overridden));
    std::vector<std::byte> bytes(400);
    EXPECT_EQ(source->probe(frames_held - 100, bytes), 100U);
    std::vector<cf32> last(100);
    sample_converter{source->facts()}.convert(bytes, last);
    EXPECT_EQ(last, frames(100, 1.0F / 32768));
}

TEST(Container, RateMayBeOverriddenAndFormatMayNot) {
    const temporary_folder folder;
    run_python(folder.path(), define_wav + "wav('a.wav', 16)");
    auto request = request_for(folder, "a.wav");
    request.rate_hz = 192000;
    const auto source = open_recording(request);
    EXPECT_EQ(source->facts().sample_rate_hz, 192000.0);
    EXPECT_TRUE(source->facts().notes.has(note_code::metadata_overridden));
    request.format = parse_sample_format("ci16_le");
    EXPECT_EQ(error_of_opening(request).exit_status, 2);
}

TEST(Container, ACodedOneCutOffIsMeasuredAsFarAsItGoes) {
    if (run_command("sox --version").status != 0)
        GTEST_SKIP() << "sox is missing: FLAC is not tested";
    const temporary_folder folder;
    ASSERT_EQ(run_command("cd " + shell_quoted(folder.path().string()) +
                          " && sox -D -R -n -r 48000 -c 2 -b 16 whole.flac synth 2 whitenoise")
                  .status,
              0);
    run_python(folder.path(), "data = open('whole.flac', 'rb').read()\n"
                              "open('cut.flac', 'wb').write(data[:len(data) // 2])");
    const auto whole = read_recording(request_for(folder, "whole.flac")).samples;
    ASSERT_EQ(whole.size(), 96000U);
    const auto source = open_recording(request_for(folder, "cut.flac"));
    const drained cut = drain(*source, 1000, 100);
    EXPECT_GT(cut.samples.size(), 30000U);
    EXPECT_LT(cut.samples.size(), 60000U);
    EXPECT_TRUE(std::equal(cut.samples.begin(), cut.samples.end(), whole.begin()));
    EXPECT_TRUE(source->facts().notes.has(note_code::container_short));
    EXPECT_TRUE(cut.blocks.back().ends_stretch);
}

TEST(MalformedContainer, EachIsOneLineWithTheMend) {
    const temporary_folder folder;
    run_python(folder.path(), define_wav + R"(
wav('junk-after.wav', 16, after=b'\x01\x02\x03\x04' * 100)
wav('empty.wav', 16, count=0)
wav('empty-list.wav', 16, count=0, after=chunk(b'LIST', b'INFO' + b'x' * 40))
wav('three.wav', 16, channels=3, size=None)
open('head.wav', 'wb').write(open('empty.wav', 'rb').read()[:20])
riff('no-data.wav', [chunk(b'fmt ', fmt(16))])
riff('no-format.wav', [chunk(b'data', bytes(400))])
open('nothing.wav', 'wb').close()
open('text.wav', 'w').write('this is no sound at all, ' * 100)
open('noise.flac', 'wb').write(b'fLaC' + hashlib.sha512(b'x').digest() * 20)
open('bad.caf', 'wb').write(b'caff' + bytes(range(200)))
open('bad.aiff', 'wb').write(b'FORM' + b'\xff' * 200)
)");
    struct row {
        const char* name;
        const char* says;
    };
    for (const row& row :
         {row{"junk-after.wav", "byte 444: the header ends the samples here, but 400"},
          row{"empty.wav", "holds no samples"}, row{"empty-list.wav", "holds no samples"},
          row{"three.wav", "has 3 channels"}, row{"head.wav", "is no container that can be read"},
          row{"no-data.wav", "no-data.wav"},
          row{"no-format.wav", "is no container that can be read"},
          row{"nothing.wav", "nothing.wav"}, row{"text.wav", "is no container that can be read"},
          row{"noise.flac", "noise.flac"}, row{"bad.caf", "is no container that can be read"},
          row{"bad.aiff", "is no container that can be read"}}) {
        const auto failure = error_of_opening(request_for(folder, row.name));
        EXPECT_EQ(failure.exit_status, 3) << failure.line;
        EXPECT_TRUE(failure.says(row.says)) << failure.line;
    }
}

} // namespace
} // namespace tonewalk
