// SPDX-License-Identifier: GPL-3.0-or-later
// SigMF archives, written by Python's tarfile and by GNU tar, read in place.
#include "recording_support.hpp"

namespace tonewalk {
namespace {

using test::define_meta;
using test::drain;
using test::error_of_opening;
using test::read_recording;
using test::run_python;
using test::temporary_folder;

const std::string define_pack = define_meta + R"(
def data(count, seed): return b''.join(struct.pack('<2h', n + seed, n - seed) for n in range(count))
def pack(name, members, mode='w', **options):
    with tarfile.open(name, mode, **options) as tar:
        for member, content in members:
            info = tarfile.TarInfo(member)
            if isinstance(content, bytes): info.size = len(content)
            else: info.type, info.linkname = content
            tar.addfile(info, io.BytesIO(content) if isinstance(content, bytes) else None)
def recording(name, count, seed, **fields):
    return [(name + '.sigmf-meta', meta(None, **fields)), (name + '.sigmf-data', data(count, seed))]
)";

std::vector<cf32> expected(std::size_t count, int seed) {
    std::vector<cf32> samples;
    for (int n = 0; n < static_cast<int>(count); ++n)
        samples.emplace_back(static_cast<float>(n + seed) / 32768.0F,
                             static_cast<float>(n - seed) / 32768.0F);
    return samples;
}

recording_request request_for(const temporary_folder& folder, const std::string& name,
                              const std::string& member = {}) {
    recording_request request;
    request.path = (folder / name).string();
    request.member = member;
    return request;
}

TEST(Archive, TheOnlyRecordingIsReadInPlace) {
    const temporary_folder folder;
    run_python(folder.path(), define_pack + R"(
pack('one.sigmf', [('notes.txt', b'hello' * 1000)] + recording('deep/er/one', 700, 5)
     + [('link', (tarfile.SYMTYPE, '/etc/passwd'))])
)");
    const auto source = open_recording(request_for(folder, "one.sigmf"));
    EXPECT_EQ(source->facts().samples(), 700);
    EXPECT_EQ(drain(*source).samples, expected(700, 5));
    EXPECT_EQ(read_recording(request_for(folder, "one")).samples.size(), 700U) << "by base name";
    std::size_t files = 0;
    for ([[maybe_unused]] const auto& entry : std::filesystem::directory_iterator{folder.path()})
        ++files;
    EXPECT_EQ(files, 1U) << "nothing is unpacked";
}

// Every form of tar header that moves the data: extended headers, long names, names beyond ASCII.
TEST(Archive, DataAreFoundBehindEveryFormOfHeader) {
    const temporary_folder folder;
    run_python(folder.path(), define_pack + R"(
long = 'd' * 90 + '/' + 'caf\u00e9' * 40
for form in 'USTAR', 'GNU', 'PAX':
    name = 'plain' if form == 'USTAR' else long
    pack(form + '.sigmf', recording(name, 300, 9), format=getattr(tarfile, form + '_FORMAT'))
)");
    for (const char* name : {"USTAR.sigmf", "GNU.sigmf", "PAX.sigmf"})
        EXPECT_EQ(read_recording(request_for(folder, name)).samples, expected(300, 9)) << name;
}

TEST(OutsideTar, ArchivesOfGnuTarAreRead) {
    const temporary_folder folder;
    run_python(folder.path(), define_pack + R"(
meta('walk'); open('walk.sigmf-data', 'wb').write(data(500, 3))
)");
    ASSERT_EQ(test::run_command("cd " + test::shell_quoted(folder.path().string()) +
                                " && tar cf packed.sigmf walk.sigmf-meta walk.sigmf-data")
                  .status,
              0);
    EXPECT_EQ(read_recording(request_for(folder, "packed.sigmf")).samples, expected(500, 3));
}

TEST(Archive, OfSeveralRecordingsOneIsNamed) {
    const temporary_folder folder;
    run_python(folder.path(), define_pack + R"(
pack('many.sigmf', recording('a/first', 100, 1) + recording('second', 200, 2))
)");
    const auto failure = error_of_opening(request_for(folder, "many.sigmf"));
    EXPECT_EQ(failure.exit_status, 2);
    EXPECT_TRUE(failure.says("--member with one of: a/first, second")) << failure.line;
    for (const char* name : {"second", "second.sigmf-meta", "second.sigmf-data"})
        EXPECT_EQ(read_recording(request_for(folder, "many.sigmf", name)).samples,
                  expected(200, 2));
    EXPECT_EQ(read_recording(request_for(folder, "many.sigmf", "a/first")).samples,
              expected(100, 1));
    const auto unknown = error_of_opening(request_for(folder, "many.sigmf", "third"));
    EXPECT_EQ(unknown.exit_status, 2);
    EXPECT_TRUE(unknown.says("no recording \"third\"")) << unknown.line;
}

TEST(Archive, VerifyAndDataSetNamesWorkInside) {
    const temporary_folder folder;
    run_python(folder.path(), define_pack + R"(
good = data(100, 4)
text = meta(None, sha512=hashlib.sha512(good).hexdigest(), dataset='x.bin')
pack('a.sigmf', [('r/x.sigmf-meta', text), ('r/x.bin', good)])
pack('b.sigmf', [('r/x.sigmf-meta', text), ('r/x.bin', good[::-1])])
)");
    auto request = request_for(folder, "a.sigmf");
    request.verify = true;
    EXPECT_EQ(read_recording(request).samples, expected(100, 4));
    request.path = (folder / "b.sigmf").string();
    EXPECT_EQ(error_of_opening(request).exit_status, 3);
}

TEST(MalformedArchive, RootedClimbingAndLinkedMembersAreRefused) {
    const temporary_folder folder;
    run_python(folder.path(), define_pack + R"(
pack('rooted.sigmf', recording('/abs/x', 10, 0))
pack('climbing.sigmf', recording('../x', 10, 0))
pack('climbing-inside.sigmf', recording('a/../../x', 10, 0))
text = meta(None)
pack('symlink.sigmf', [('x.sigmf-meta', text), ('x.sigmf-data', (tarfile.SYMTYPE, '/etc/passwd'))])
pack('hardlink.sigmf', [('y', b'abcd'), ('x.sigmf-meta', text),
                        ('x.sigmf-data', (tarfile.LNKTYPE, 'y'))])
pack('folder.sigmf', [('x.sigmf-meta', text), ('x.sigmf-data', (tarfile.DIRTYPE, ''))])
pack('device.sigmf', [('x.sigmf-meta', text), ('x.sigmf-data', (tarfile.CHRTYPE, ''))])
pack('meta-link.sigmf', [('x.sigmf-meta', (tarfile.SYMTYPE, 'y')), ('x.sigmf-data', b'abcd')])
)");
    struct row {
        const char* name;
        const char* says;
    };
    for (const row& row : {row{"rooted.sigmf", "leads out of the archive"},
                           row{"climbing.sigmf", "leads out of the archive"},
                           row{"climbing-inside.sigmf", "leads out of the archive"},
                           row{"symlink.sigmf", "\"x.sigmf-data\": is a link"},
                           row{"hardlink.sigmf", "\"x.sigmf-data\": is a link"},
                           row{"folder.sigmf", "has no file"}, row{"device.sigmf", "is no file"},
                           row{"meta-link.sigmf", "\"x.sigmf-meta\": is a link"}}) {
        const auto failure = error_of_opening(request_for(folder, row.name));
        EXPECT_EQ(failure.exit_status, 3) << failure.line;
        EXPECT_TRUE(failure.says(row.says)) << failure.line;
    }
}

TEST(MalformedArchive, CompressedOnesAreRefusedByName) {
    const temporary_folder folder;
    run_python(folder.path(), define_pack + R"(
for how in 'gz', 'bz2', 'xz': pack(how + '.sigmf', recording('x', 10, 0), 'w:' + how)
)");
    for (const auto& [name, how] : {std::pair{"gz.sigmf", "gzip"}, std::pair{"bz2.sigmf", "bzip2"},
                                    std::pair{"xz.sigmf", "xz"}}) {
        const auto failure = error_of_opening(request_for(folder, name));
        EXPECT_EQ(failure.kind, fault::unsupported);
        EXPECT_EQ(failure.exit_status, 3);
        EXPECT_TRUE(failure.says(how)) << failure.line;
    }
}

TEST(MalformedArchive, BrokenOnesAreOneLine) {
    const temporary_folder folder;
    run_python(folder.path(), define_pack + R"(
open('empty.sigmf', 'wb').close()
open('zeros.sigmf', 'wb').write(bytes(10240))
open('noise.sigmf', 'wb').write(hashlib.sha512(b'x').digest() * 100)
pack('nothing.sigmf', [('readme', b'hello')])
pack('no-data.sigmf', recording('x', 10, 0)[:1])
pack('twice.sigmf', recording('x', 10, 0) + recording('x', 10, 1))
pack('twice-data.sigmf', recording('x', 10, 0) + recording('x', 10, 1)[1:])
pack('bad-meta.sigmf', [('x.sigmf-meta', b'{'), ('x.sigmf-data', b'abcd')])
pack('whole.sigmf', recording('x', 5000, 0))
whole = open('whole.sigmf', 'rb').read()
open('cut.sigmf', 'wb').write(whole[:6000])
open('cut-header.sigmf', 'wb').write(whole[:1024 + 200])
os.mkdir('folder.sigmf')
)");
    struct row {
        const char* name;
        const char* says;
    };
    for (const row& row :
         {row{"empty.sigmf", "empty.sigmf"}, row{"zeros.sigmf", "no recording"},
          row{"noise.sigmf", "is no whole tar archive"}, row{"nothing.sigmf", "holds no recording"},
          row{"no-data.sigmf", "has no file \"x.sigmf-data\""},
          row{"twice.sigmf", "\"x.sigmf-meta\" twice"},
          row{"twice-data.sigmf", "\"x.sigmf-data\" twice"},
          row{"bad-meta.sigmf", "member \"x.sigmf-meta\", byte"},
          row{"cut.sigmf", "ends before its member \"x.sigmf-data\""},
          row{"cut-header.sigmf", "cut-header.sigmf"}, row{"folder.sigmf", "folder.sigmf"},
          row{"missing.sigmf", "cannot be read"}}) {
        const auto failure = error_of_opening(request_for(folder, row.name));
        EXPECT_EQ(failure.exit_status, 3) << failure.line;
        EXPECT_TRUE(failure.says(row.says)) << failure.line;
    }
}

TEST(MalformedArchive, MembersStoredWithHolesAreRefused) {
    const temporary_folder folder;
    run_python(folder.path(), define_pack + R"(
meta('x')
with open('x.sigmf-data', 'wb') as file:
    file.truncate(1 << 20); file.seek(1 << 19); file.write(data(100, 1))
)");
    ASSERT_EQ(test::run_command("cd " + test::shell_quoted(folder.path().string()) +
                                " && tar cSf s.sigmf x.sigmf-meta x.sigmf-data")
                  .status,
              0);
    ASSERT_LT(std::filesystem::file_size(folder / "s.sigmf"), 1U << 19) << "tar kept no holes";
    const auto failure = error_of_opening(request_for(folder, "s.sigmf"));
    EXPECT_EQ(failure.exit_status, 3);
    EXPECT_TRUE(failure.says("stored with holes")) << failure.line;
}

} // namespace
} // namespace tonewalk
