// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/base/output_file.hpp"

#include <array>
#include <atomic>
#include <cerrno>
#include <csignal>
#include <optional>
#include <thread>
#include <vector>

#include <fcntl.h>
#include <sys/resource.h>
#include <sys/stat.h>
#include <unistd.h>

#include "support/expect_error.hpp"
#include "support/temporary_folder.hpp"

namespace {

using namespace tonewalk;
using test::caught;
namespace fs = std::filesystem;

std::size_t files_in(const test::temporary_folder& folder) {
    return static_cast<std::size_t>(
        std::distance(fs::directory_iterator{folder.path()}, fs::directory_iterator{}));
}

/// Holds the size of files that this process may write, and lets write() say so instead of a
/// signal.
class size_limit {
public:
    explicit size_limit(rlim_t bytes) {
        ::getrlimit(RLIMIT_FSIZE, &before_);
        rlimit limit = before_;
        limit.rlim_cur = bytes;
        ::setrlimit(RLIMIT_FSIZE, &limit);
        handler_ = std::signal(SIGXFSZ, SIG_IGN);
    }
    size_limit(const size_limit&) = delete;
    size_limit& operator=(const size_limit&) = delete;
    ~size_limit() {
        ::setrlimit(RLIMIT_FSIZE, &before_);
        std::signal(SIGXFSZ, handler_);
    }

private:
    rlimit before_{};
    void (*handler_)(int) = SIG_DFL;
};

TEST(OutputFile, AppearsWholeAtCommitAndNotBefore) {
    const test::temporary_folder folder;
    const std::string text(300'000, 'x');
    output_file file{folder / "a.json"};
    file.write(text);
    file.write("end");
    EXPECT_FALSE(fs::exists(folder / "a.json"));
    file.commit();
    EXPECT_EQ(test::read_file(folder / "a.json"), text + "end");
    EXPECT_EQ(files_in(folder), 1U);
}

TEST(OutputFile, LeavesNothingWhenItIsNotCommitted) {
    const test::temporary_folder folder;
    {
        output_file file{folder / "a.json"};
        file.write("half");
        EXPECT_EQ(files_in(folder), 1U); // the temporary
    }
    EXPECT_EQ(files_in(folder), 0U);
}

TEST(OutputFile, LeavesNothingWhenTheDiskRefusesTheRest) {
    const test::temporary_folder folder;
    const size_limit limit{1 << 20};
    const auto failure = caught([&] {
        output_file file{folder / "big.csv"};
        const std::string part(100'000, 'x');
        for (int i = 0; i < 20; ++i)
            file.write(part);
        file.commit();
    });
    EXPECT_EQ(failure.kind, fault::unwritable);
    EXPECT_EQ(failure.exit_status, 4);
    EXPECT_TRUE(failure.says("big.csv: cannot be written (File too large); make room"))
        << failure.line;
    EXPECT_EQ(files_in(folder), 0U);
}

TEST(OutputFile, KeepsTheOldFileWhenAForcedOneFails) {
    const test::temporary_folder folder;
    test::write_file(folder / "a.csv", "old");
    const size_limit limit{1 << 20};
    EXPECT_EQ(caught([&] {
                  output_file file{folder / "a.csv", true};
                  file.write(std::string(2'000'000, 'x'));
                  file.commit();
              }).kind,
              fault::unwritable);
    EXPECT_EQ(test::read_file(folder / "a.csv"), "old");
    EXPECT_EQ(files_in(folder), 1U);
}

TEST(OutputFile, SaysNoSpaceWhenTheDeviceIsFull) {
    const auto failure = caught([] {
        output_file file{"/dev/full"};
        file.write("x");
        file.commit();
    });
    EXPECT_EQ(failure.kind, fault::unwritable);
    EXPECT_TRUE(failure.says("No space left on device")) << failure.line;
}

TEST(OutputFile, RefusesAnExistingFileUnlessForced) {
    const test::temporary_folder folder;
    test::write_file(folder / "a.csv", "old");
    const auto refused = caught([&] { output_file file{folder / "a.csv"}; });
    EXPECT_EQ(refused.kind, fault::unwritable);
    EXPECT_TRUE(refused.says("exists already; choose another name or add --force")) << refused.line;
    output_file file{folder / "a.csv", true};
    file.write("new");
    file.commit();
    EXPECT_EQ(test::read_file(folder / "a.csv"), "new");
}

TEST(OutputFile, NeverReplacesAFileThatAppearedMeanwhile) {
    const test::temporary_folder folder;
    output_file file{folder / "a.csv"};
    file.write("mine");
    test::write_file(folder / "a.csv", "theirs");
    const auto refused = caught([&] { file.commit(); });
    EXPECT_EQ(refused.kind, fault::unwritable);
    EXPECT_TRUE(refused.says("has appeared meanwhile")) << refused.line;
    EXPECT_EQ(test::read_file(folder / "a.csv"), "theirs");
}

TEST(OutputFile, LetsExactlyOneOfManyRacersWin) {
    const test::temporary_folder folder;
    std::atomic<int> winners{0}, losers{0};
    std::vector<std::thread> racers;
    for (int i = 0; i < 8; ++i)
        racers.emplace_back([&, i] {
            try {
                output_file file{folder / "a.csv"};
                file.write(std::string(10'000, static_cast<char>('a' + i)));
                file.commit();
                ++winners;
            } catch (const error&) {
                ++losers;
            }
        });
    for (std::thread& each : racers)
        each.join();
    EXPECT_EQ(winners, 1);
    EXPECT_EQ(losers, 7);
    EXPECT_EQ(files_in(folder), 1U);
    const std::string text = test::read_file(folder / "a.csv");
    EXPECT_EQ(text, std::string(10'000, text.front()));
}

TEST(OutputFile, RefusesAMissingFolderAndAFolderAsTarget) {
    const test::temporary_folder folder;
    const auto missing = caught([&] { output_file file{folder / "no/a.csv"}; });
    EXPECT_EQ(missing.kind, fault::unwritable);
    EXPECT_TRUE(missing.says("is in a folder that does not exist; make the folder first"))
        << missing.line;
    EXPECT_EQ(caught([&] { output_file file{folder.path(), true}; }).kind, fault::unwritable);
}

TEST(OutputFile, RefusesNamesThatTheSystemDoesNotTake) {
    const test::temporary_folder folder;
    test::write_file(folder / "file", "");
    EXPECT_EQ(caught([&] { output_file file{folder / "file/a.csv"}; }).kind, fault::unwritable);
    const fs::path long_name = folder / std::string(300, 'n');
    const auto too_long = caught([&] { output_file file{long_name}; });
    EXPECT_EQ(too_long.kind, fault::unwritable) << too_long.line;
    const auto deep = caught([&] { output_file file{long_name / "a.csv"}; });
    EXPECT_EQ(deep.kind, fault::unwritable) << deep.line;
}

TEST(OutputFile, WritesAFifoInPlace) {
    const test::temporary_folder folder;
    const fs::path pipe = folder / "pipe";
    ASSERT_EQ(::mkfifo(pipe.c_str(), 0600), 0);
    std::string received;
    std::thread reader{[&] { received = test::read_file(pipe); }};
    std::optional<output_file> file{output_file{pipe}};
    file->write(std::string(200'000, 'x'));
    file->commit();
    file.reset();
    reader.join();
    EXPECT_EQ(received, std::string(200'000, 'x'));
    EXPECT_TRUE(fs::is_fifo(pipe));
    EXPECT_EQ(files_in(folder), 1U);
}

TEST(OutputFile, IsQuietWhenTheReaderOfStandardOutputLeaves) {
    std::array<int, 2> ends{};
    ASSERT_EQ(::pipe(ends.data()), 0);
    const int kept = ::dup(STDOUT_FILENO);
    const auto handler = std::signal(SIGPIPE, SIG_IGN);
    ::dup2(ends[1], STDOUT_FILENO);
    ::close(ends[1]);
    ::close(ends[0]); // the reader has gone
    output_file file{"-"};
    EXPECT_NO_THROW(file.write(std::string(200'000, 'x')));
    EXPECT_NO_THROW(file.commit());
    ::dup2(kept, STDOUT_FILENO);
    ::close(kept);
    std::signal(SIGPIPE, handler);
    EXPECT_TRUE(file.closed_by_reader());
}

TEST(OutputFile, FollowsALinkOnlyWhenForced) {
    const test::temporary_folder folder;
    test::write_file(folder / "real.csv", "old");
    fs::create_symlink("real.csv", folder / "link.csv");
    EXPECT_EQ(caught([&] { output_file file{folder / "link.csv"}; }).kind, fault::unwritable);
    output_file file{folder / "link.csv", true};
    file.write("new");
    file.commit();
    EXPECT_TRUE(fs::is_symlink(folder / "link.csv"));
    EXPECT_EQ(test::read_file(folder / "real.csv"), "new");
}

TEST(OutputFile, MovesWithoutLosingItsTemporary) {
    const test::temporary_folder folder;
    std::vector<output_file> files;
    files.emplace_back(folder / "a.csv");
    files.back().write("a");
    files.emplace_back(folder / "b.csv"); // grows: the first one moves
    files.back().write("b");
    for (output_file& each : files)
        each.commit();
    EXPECT_EQ(test::read_file(folder / "a.csv"), "a");
    EXPECT_EQ(test::read_file(folder / "b.csv"), "b");
}

TEST(OutputFile, HasLongNamesToo) {
    const test::temporary_folder folder;
    const std::string name(255, 'n');
    output_file file{folder / name};
    file.write("x");
    file.commit();
    EXPECT_EQ(test::read_file(folder / name), "x");
}

TEST(WriteFully, GivesTheReasonWhereNotAllCanBeWritten) {
    const int full = ::open("/dev/full", O_WRONLY), closed = -1;
    EXPECT_EQ(write_fully(full, "text"), ENOSPC);
    EXPECT_EQ(write_fully(closed, "text"), EBADF);
    EXPECT_EQ(write_fully(closed, ""), 0);
    ::close(full);
}

TEST(RemoveTemporaries, RemovesThoseInProgressAndNothingElse) {
    const test::temporary_folder folder;
    output_file done{folder / "done.csv"};
    done.commit();
    output_file open{folder / "open.csv"};
    open.write("half");
    remove_temporaries();
    EXPECT_EQ(files_in(folder), 1U);
    EXPECT_TRUE(fs::exists(folder / "done.csv"));
}

TEST(CheckDistinctOutputs, RefusesTwoNamesOfOneFile) {
    const test::temporary_folder folder;
    test::write_file(folder / "a.csv", "");
    fs::create_symlink("a.csv", folder / "b.csv");
    fs::create_hard_link(folder / "a.csv", folder / "c.csv");
    const auto refusal = [](std::vector<fs::path> outputs) {
        return caught([&] { check_distinct_outputs(outputs); }).kind;
    };
    EXPECT_EQ(refusal({folder / "x.csv", folder / "y.csv", "-"}), std::nullopt);
    EXPECT_EQ(refusal({"-", "-"}), fault::bad_request);
    EXPECT_EQ(refusal({folder / "x.csv", folder.path() / "." / "x.csv"}), fault::bad_request);
    EXPECT_EQ(refusal({folder / "a.csv", folder / "b.csv"}), fault::bad_request);
    EXPECT_EQ(refusal({folder / "a.csv", folder / "c.csv"}), fault::bad_request);
}

} // namespace
