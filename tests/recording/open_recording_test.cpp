// SPDX-License-Identifier: GPL-3.0-or-later
// What open_recording finds under a name, and what options change in it.
#include "recording_support.hpp"
#include "tonewalk/recording/verify.hpp"

namespace tonewalk {
namespace {

using test::define_meta;
using test::drain;
using test::error_of_opening;
using test::read_recording;
using test::run_python;
using test::temporary_folder;
using test::write_file;

// Frame n is (n, -n) / 32768.
std::vector<cf32> ramp(std::size_t first, std::size_t count) {
    std::vector<cf32> samples;
    for (std::size_t n = first; n < first + count; ++n)
        samples.emplace_back(static_cast<float>(n) / 32768.0F, -static_cast<float>(n) / 32768.0F);
    return samples;
}

const std::string define_ramp = define_meta + R"(
def ramp(count): return b''.join(struct.pack('<2h', n, -n) for n in range(count))
)";

TEST(OpenRecording, FindsSigmfByMetadataDataOrBaseName) {
    const temporary_folder folder;
    run_python(folder.path(), define_ramp + R"(
meta('walk', captures=[{'core:sample_start': 0, 'core:frequency': 145.2e6,
                        'core:datetime': '2026-05-04T09:30:00.5Z'}])
open('walk.sigmf-data', 'wb').write(ramp(1000))
)");
    for (const char* name : {"walk.sigmf-meta", "walk.sigmf-data", "walk"}) {
        recording_request request;
        request.path = (folder / name).string();
        const auto source = open_recording(request);
        const stream_facts& facts = source->facts();
        EXPECT_EQ(facts.name, request.path);
        EXPECT_EQ(facts.format_name, "ci16_le");
        EXPECT_EQ(facts.code_bits, 16U);
        EXPECT_EQ(facts.sample_rate_hz, 48000.0);
        EXPECT_EQ(facts.centre_hz, 145.2e6);
        EXPECT_EQ(facts.start_utc, parse_utc("2026-05-04T09:30:00.5Z"));
        EXPECT_EQ(facts.samples(), 1000);
        EXPECT_EQ(facts.duration_s(), 1000 / 48000.0);
        EXPECT_TRUE(facts.notes.all().empty());
        EXPECT_TRUE(facts.sha512.empty());
        EXPECT_EQ(drain(*source).samples, ramp(0, 1000));
    }
}

// SIG-27: real, two lanes, 48 kS/s, hashed, with a time to the microsecond.
TEST(OpenRecording, ReadsRealTwoLaneRecordings) {
    const temporary_folder folder;
    run_python(folder.path(), define_meta + R"(
data = b''.join(struct.pack('<2h', 16 * n, -32 * n) for n in range(500))
meta('logo', 'ri16_le', num_channels=2, sha512=hashlib.sha512(data).hexdigest(),
     captures=[{'core:sample_start': 0, 'core:datetime': '2021-06-18T23:17:51.163959Z'}])
open('logo.sigmf-data', 'wb').write(data)
)");
    recording_request request;
    request.path = (folder / "logo").string();
    request.verify = true;
    for (const unsigned lane : {0U, 1U}) {
        request.lane = lane;
        const auto source = open_recording(request);
        EXPECT_EQ(source->facts().lanes, 2U);
        EXPECT_EQ(source->facts().sha512.size(), 128U);
        EXPECT_EQ(format_utc(*source->facts().start_utc, 6), "2021-06-18T23:17:51.163959Z");
        const auto samples = drain(*source).samples;
        ASSERT_EQ(samples.size(), 500U);
        for (std::size_t n = 0; n < samples.size(); ++n) {
            const float stored = (lane == 0 ? 16.0F : -32.0F) * static_cast<float>(n) / 32768.0F;
            ASSERT_EQ(samples[n], (cf32{2.0F * stored, 0.0F}));
        }
    }
    request.lane = 2;
    const auto failure = error_of_opening(request);
    EXPECT_EQ(failure.exit_status, 3);
    EXPECT_TRUE(failure.says("2 lanes")) << failure.line;
}

TEST(OpenRecording, RawFilesNeedFormatAndRate) {
    const temporary_folder folder;
    run_python(folder.path(), define_ramp + "open('raw.iq', 'wb').write(ramp(100) + b'x')");
    recording_request request;
    request.path = (folder / "raw.iq").string();
    EXPECT_EQ(error_of_opening(request).kind, fault::bad_request);
    EXPECT_TRUE(error_of_opening(request).says("--format"));
    request.format = parse_sample_format("ci16_le");
    EXPECT_EQ(error_of_opening(request).kind, fault::bad_request);
    EXPECT_TRUE(error_of_opening(request).says("--rate"));
    request.rate_hz = 1e6;
    request.centre_hz = 7e6;
    const auto source = open_recording(request);
    EXPECT_EQ(source->facts().centre_hz, 7e6);
    EXPECT_FALSE(source->facts().notes.has(note_code::metadata_overridden));
    EXPECT_TRUE(source->facts().notes.has(note_code::odd_tail));
    EXPECT_EQ(drain(*source).samples, ramp(0, 100));
}

TEST(OpenRecording, OverridesAreNotedOnlyWhereTheRecordingSaysOtherwise) {
    const temporary_folder folder;
    run_python(folder.path(), define_ramp + R"(
meta('walk', captures=[{'core:sample_start': 0, 'core:frequency': 145.2e6,
                        'core:datetime': '2026-05-04T09:30:00Z'}])
open('walk.sigmf-data', 'wb').write(ramp(10))
meta('silent', rate=None)
open('silent.sigmf-data', 'wb').write(ramp(10))
)");
    const auto notes_of = [&](const char* name, auto change) {
        recording_request request;
        request.path = (folder / name).string();
        change(request);
        return open_recording(request)->facts().notes;
    };
    const auto same = notes_of("walk", [](recording_request& request) {
        request.format = parse_sample_format("ci16_le");
        request.rate_hz = 48000;
        request.centre_hz = 145.2e6;
        request.start_utc = parse_utc("2026-05-04T09:30:00Z");
    });
    EXPECT_TRUE(same.all().empty());
    const auto added = notes_of("silent", [](recording_request& request) {
        request.rate_hz = 48000;
        request.centre_hz = 145.2e6;
        request.start_utc = parse_utc("2026-05-04T09:30:00Z");
    });
    EXPECT_TRUE(added.all().empty());
    const auto other = notes_of("walk", [](recording_request& request) {
        request.format = parse_sample_format("ri16_be");
        request.rate_hz = 44100;
        request.centre_hz = 145.3e6;
        request.start_utc = parse_utc("2026-05-04T09:30:01Z");
    });
    ASSERT_EQ(other.all().size(), 1U);
    EXPECT_EQ(other.all()[0].code, note_code::metadata_overridden);
    for (const char* said : {"ci16_le", "48000", "145.2 MHz", "09:30:00"})
        EXPECT_NE(other.all()[0].text.find(said), std::string::npos) << other.all()[0].text;
    recording_request request;
    request.path = (folder / "silent").string();
    EXPECT_EQ(error_of_opening(request).kind, fault::bad_request) << "no rate";
}

TEST(OpenRecording, FromAndUntilCutInSecondsOrTimeOfDay) {
    const temporary_folder folder;
    run_python(folder.path(), define_ramp + R"(
meta('walk', rate=1000,
     captures=[{'core:sample_start': 0, 'core:datetime': '2026-05-04T09:30:00Z'}])
open('walk.sigmf-data', 'wb').write(ramp(2000))
meta('timeless', rate=1000)
open('timeless.sigmf-data', 'wb').write(ramp(2000))
)");
    recording_request request;
    request.path = (folder / "walk").string();
    request.from = 0.3;
    request.until = 0.7;
    auto source = open_recording(request);
    EXPECT_EQ(source->facts().stretches.at(0).first, 300);
    EXPECT_EQ(source->facts().stretches.at(0).position, 300);
    EXPECT_EQ(source->facts().span_s(), 0.4);
    EXPECT_EQ(source->facts().start_utc, parse_utc("2026-05-04T09:30:00Z"))
        << "still the recording's first sample";
    EXPECT_EQ(drain(*source).samples, ramp(300, 400));
    request.from = parse_utc("2026-05-04T09:30:01.5Z").value();
    request.until.reset();
    EXPECT_EQ(read_recording(request).samples, ramp(1500, 500));
    request.from = 2.0;
    auto failure = error_of_opening(request);
    EXPECT_EQ(failure.exit_status, 3);
    EXPECT_TRUE(failure.says("past the end at 2 s")) << failure.line;
    request.from = 1.0;
    request.until = 0.5;
    EXPECT_EQ(error_of_opening(request).exit_status, 2);
    request.from = parse_utc("2026-05-04T09:29:59Z").value();
    EXPECT_EQ(error_of_opening(request).exit_status, 3);
    request.path = (folder / "timeless").string();
    failure = error_of_opening(request);
    EXPECT_EQ(failure.exit_status, 2);
    EXPECT_TRUE(failure.says("--start-utc")) << failure.line;
}

TEST(OpenRecording, VerifyHoldsTheDataAgainstTheStatedHash) {
    const temporary_folder folder;
    run_python(folder.path(), define_ramp + R"(
data = ramp(1000) * 1000
open('good.sigmf-data', 'wb').write(data)
open('bad.sigmf-data', 'wb').write(data[:-1] + b'?')
for name in 'good', 'bad': meta(name, sha512=hashlib.sha512(data).hexdigest().upper())
open('hash', 'w').write(hashlib.sha512(data).hexdigest())
open('raw.iq', 'wb').write(data)
)");
    const std::string hash = test::read_file(folder / "hash");
    recording_request request;
    request.path = (folder / "good").string();
    request.verify = true;
    EXPECT_EQ(open_recording(request)->facts().sha512, hash);
    request.path = (folder / "bad").string();
    const auto failure = error_of_opening(request);
    EXPECT_EQ(failure.exit_status, 3);
    EXPECT_TRUE(failure.says("bad.sigmf-data: SHA-512")) << failure.line;
    request.verify = false;
    EXPECT_NO_THROW((void)open_recording(request));
    const data_hash found = hash_data(request);
    EXPECT_TRUE(found.differs());
    EXPECT_EQ(found.stated, hash);
    request.path = (folder / "raw.iq").string();
    EXPECT_EQ(hash_data(request).found, hash);
    EXPECT_FALSE(hash_data(request).differs());
}

TEST(OpenRecording, NamesThatAreNoUtf8Survive) {
    const temporary_folder folder;
    run_python(folder.path(), define_ramp + R"(
name = b'caf\xe9 \xff'
open(name + b'.sigmf-meta', 'wb').write(meta(None))
open(name + b'.sigmf-data', 'wb').write(ramp(10))
)");
    recording_request request;
    request.path = folder.path().string() + "/caf\xE9 \xFF";
    const auto source = open_recording(request);
    EXPECT_EQ(source->facts().name, request.path);
    EXPECT_EQ(drain(*source).samples, ramp(0, 10));
    request.path += "\n missing";
    EXPECT_TRUE(error_of_opening(request).says("caf\uFFFD \uFFFD? missing"));
}

TEST(MalformedRaw, EachIsOneLineWithTheMend) {
    const temporary_folder folder;
    run_python(folder.path(), R"(
open('empty.iq', 'wb').close()
open('one-byte.iq', 'wb').write(b'x')
open('four.iq', 'wb').write(b'abcd')
os.mkdir('folder')
open('x.sigmf-collection', 'w').write('{}')
open('data-only.sigmf-data', 'wb').write(b'abcd')
open('packed.iq.gz', 'wb').write(b'\x1f\x8b\x08\x00')
)");
    struct row {
        const char* name;
        int status;
        const char* says;
    };
    for (const row& row :
         {row{"empty.iq", 3, "holds no samples"}, row{"one-byte.iq", 3, "holds no samples"},
          row{"missing.iq", 3, "cannot be read"}, row{"missing/folder.iq", 3, "cannot be read"},
          row{"folder", 3, "is a folder"},
          row{"x.sigmf-collection", 3, "one of the recordings that it lists"}}) {
        recording_request request;
        request.path = (folder / row.name).string();
        request.format = parse_sample_format("ci16_le");
        request.rate_hz = 1e6;
        const auto failure = error_of_opening(request);
        EXPECT_EQ(failure.exit_status, row.status) << failure.line;
        EXPECT_TRUE(failure.says(row.says)) << failure.line;
        EXPECT_TRUE(failure.says(row.name)) << failure.line;
    }
    recording_request request;
    request.path = (folder / "data-only.sigmf-data").string();
    EXPECT_EQ(error_of_opening(request).exit_status, 2);
    EXPECT_TRUE(error_of_opening(request).says(".sigmf-meta file is missing"));
    request.path = (folder / "packed.iq.gz").string();
    EXPECT_TRUE(error_of_opening(request).says("is compressed (gzip)"));
    request.path = (folder / "four.iq").string();
    request.format = parse_sample_format("cu8");
    for (const double rate : {0.0, -1.0, 1e13, std::numeric_limits<double>::quiet_NaN()}) {
        request.rate_hz = rate;
        EXPECT_EQ(error_of_opening(request).exit_status, 2);
    }
    request.rate_hz = 1e6;
    request.lane = 1;
    EXPECT_EQ(error_of_opening(request).exit_status, 3);
    request.lane.reset();
    request.member = "x";
    EXPECT_EQ(error_of_opening(request).exit_status, 2);
}

} // namespace
} // namespace tonewalk
