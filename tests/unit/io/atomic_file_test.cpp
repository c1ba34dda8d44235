// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/atomic_file.h"

#include <gtest/gtest.h>
#include <sys/resource.h>

#include <csignal>

#include "base/error.h"
#include "support/temporary_folder.h"

namespace foreglow {
namespace {

using testing::read_whole_file;
using testing::TemporaryFolder;
using testing::write_whole_file;
using Names = std::set<std::string>;

std::span<const std::byte> bytes_of(std::string_view text) {
    return std::as_bytes(std::span(text));
}

TEST(AtomicFile, HasItsNameOnlyAfterCommit) {
    const TemporaryFolder folder;
    AtomicFile file(folder / "a.bin");
    file.write_at(2, bytes_of("cd"));
    file.write_at(0, bytes_of("ab"));
    EXPECT_EQ(folder.names(), Names{"a.bin.part"});
    file.commit();
    EXPECT_EQ(folder.names(), Names{"a.bin"});
    EXPECT_EQ(read_whole_file(folder / "a.bin"), "abcd");
}

TEST(AtomicFile, LeavesNothingWithoutCommitAndKeepsTheOldFile) {
    const TemporaryFolder folder;
    write_whole_file(folder / "a.bin", "old");
    {
        AtomicFile file(folder / "a.bin");
        file.write_at(0, bytes_of("new"));
    }
    EXPECT_EQ(folder.names(), Names{"a.bin"});
    EXPECT_EQ(read_whole_file(folder / "a.bin"), "old");
}

TEST(AtomicFile, ReplacesAnOldFileAndALeftOverPart) {
    const TemporaryFolder folder;
    write_whole_file(folder / "a.txt", "old");
    write_whole_file(folder / "a.txt.part", "a longer left-over of a run that was killed");
    write_text_file(folder / "a.txt", "new");
    EXPECT_EQ(folder.names(), Names{"a.txt"});
    EXPECT_EQ(read_whole_file(folder / "a.txt"), "new");
}

TEST(AtomicFile, NamesTheFileAndTheReasonWhereTheFolderIsNotThere) {
    const TemporaryFolder folder;
    try {
        write_text_file(folder / "absent/a.txt", "text");
        FAIL() << "no error";
    } catch (const FileError& error) {
        EXPECT_EQ(error.what(),
                  "cannot create " + (folder / "absent/a.txt").string() + ": No such file or directory");
        EXPECT_EQ(error.exit_status(), 1);
    }
    EXPECT_TRUE(folder.names().empty());
}

TEST(AtomicFile, CannotTakeTheNameOfAFolder) {
    const TemporaryFolder folder;
    std::filesystem::create_directory(folder / "a");
    EXPECT_THROW(write_text_file(folder / "a", "text"), FileError);
    EXPECT_EQ(folder.names(), Names{"a"});
}

/// Lets this process write files of at most some bytes, as a full disk would, while it lives.
class FileSizeLimit {
  public:
    explicit FileSizeLimit(rlim_t bytes) {
        ::getrlimit(RLIMIT_FSIZE, &old_);
        rlimit limit = old_;
        limit.rlim_cur = bytes;
        ::setrlimit(RLIMIT_FSIZE, &limit);
        old_handler_ = std::signal(SIGXFSZ, SIG_IGN);
    }
    ~FileSizeLimit() {
        ::setrlimit(RLIMIT_FSIZE, &old_);
        std::signal(SIGXFSZ, old_handler_);
    }
    FileSizeLimit(const FileSizeLimit&) = delete;
    FileSizeLimit& operator=(const FileSizeLimit&) = delete;

  private:
    rlimit old_{};
    void (*old_handler_)(int) = nullptr;
};

TEST(AtomicFile, LeavesNothingWhereTheWritingFails) {
    const TemporaryFolder folder;
    const FileSizeLimit limit(1000);
    try {
        write_text_file(folder / "a.txt", std::string(5000, 'x'));
        FAIL() << "no error";
    } catch (const FileError& error) {
        EXPECT_EQ(error.what(), "cannot write " + (folder / "a.txt").string() + ": File too large");
    }
    EXPECT_TRUE(folder.names().empty());
}

TEST(AtomicFile, SaysWhatToDoWhereTheDiskIsFull) {
    const TemporaryFolder folder;
    AtomicFile file(folder / "a.bin");
    try {
        file.fail("write", ENOSPC);
    } catch (const FileError& error) {
        EXPECT_EQ(error.what(), "cannot write " + (folder / "a.bin").string() +
                                    ": No space left on device; free some space or write elsewhere");
    }
    EXPECT_THROW(file.reserve(std::int64_t{1} << 60), FileError);  // an exbibyte
}

}  // namespace
}  // namespace foreglow
