// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/output_folder.h"

#include <gtest/gtest.h>

#include "base/error.h"
#include "io/json_value.h"
#include "jobs/manifest.h"
#include "support/messages.h"
#include "support/temporary_folder.h"

namespace foreglow {
namespace {

namespace fs = std::filesystem;
using testing::has;
using testing::message_of;
using testing::write_whole_file;

class OutputFolders : public ::testing::Test {
  protected:
    // Leaves a manifest that lists these names.
    void write_manifest(const std::vector<std::string>& names) const {
        JsonValue::Array outputs;
        for (const std::string& name : names)
            outputs.push_back(JsonValue::Object{{"name", name}});
        write_whole_file(out_ / "run.json", write_json(JsonValue::Object{{"outputs", outputs}}));
    }
    void touch(const fs::path& path) const {
        fs::create_directories(path.parent_path());
        write_whole_file(path, "x");
    }
    testing::TemporaryFolder folder_;
    const fs::path out_ = folder_ / "out";
};

TEST_F(OutputFolders, ThatAreNewOrEmptyAreFine) {
    EXPECT_NO_THROW(check_output_folder(out_, false));
    fs::create_directory(out_);
    EXPECT_NO_THROW(check_output_folder(out_, false));
}

TEST_F(OutputFolders, ThatHoldSomethingNeedReplace) {
    touch(out_ / "a");
    const std::string message = message_of<InputError>([&] {
        check_output_folder(out_, false);
        return 0;
    });
    EXPECT_TRUE(
        has(message, out_.string() + " exists and is not empty: add --replace, or give another with --out"));
    EXPECT_NO_THROW(check_output_folder(out_, true));
    EXPECT_THROW(check_output_folder(out_ / "a", true), InputError) << "a file is no folder";
}

TEST_F(OutputFolders, AreMadeOnlyWhenSomethingIsWritten) {
    {
        OutputFolder folder(out_, false);
        EXPECT_FALSE(fs::exists(out_));
        EXPECT_EQ(folder.prepare("truth/channels/a.fits"), out_ / "truth/channels/a.fits");
        EXPECT_TRUE(fs::is_directory(out_ / "truth/channels"));
        touch(out_ / "truth/channels/a.fits");
        folder.keep();
    }
    EXPECT_TRUE(fs::exists(out_ / "truth/channels/a.fits"));
}

TEST_F(OutputFolders, LeaveNothingWithoutKeep) {
    {
        OutputFolder folder(out_ / "deep" / "run", false);
        touch(folder.prepare("maps/a.fits"));
        touch(folder.prepare("truth/channels/a.fits"));
        static_cast<void>(folder.prepare("report.html"));  // not written yet when the run failed
    }
    EXPECT_FALSE(fs::exists(out_));
    fs::create_directory(out_);
    {
        OutputFolder folder(out_, false);
        touch(folder.prepare("maps/a.fits"));
    }
    EXPECT_TRUE(fs::exists(out_)) << "a folder that was there stays";
    EXPECT_TRUE(fs::is_empty(out_));
}

TEST_F(OutputFolders, FailureTouchesNothingOfOthers) {
    touch(out_ / "maps/mine.txt");
    fs::create_directories(out_ / "maps/a.fits");  // someone's empty folder where a map should go
    {
        OutputFolder folder(out_, true);
        static_cast<void>(folder.prepare("maps/a.fits"));
        touch(folder.prepare("maps/b.fits"));
    }
    EXPECT_TRUE(fs::exists(out_ / "maps/mine.txt"));
    EXPECT_TRUE(fs::is_directory(out_ / "maps/a.fits"));
    EXPECT_FALSE(fs::exists(out_ / "maps/b.fits"));
}

TEST_F(OutputFolders, AFileWhereAFolderShouldBeIsSaid) {
    touch(folder_ / "file");
    OutputFolder folder(folder_ / "file" / "out", false);
    EXPECT_TRUE(
        has(message_of<FileError>([&] { return folder.prepare("maps/a.fits"); }), "cannot make the folder"));
}

TEST_F(OutputFolders, ReplaceRemovesWhatTheEarlierRunListedAndNothingElse) {
    for (const char* name : {"maps/low.fits", "maps/mine.fits", "truth/index.fits", "truth/channels/low.fits",
                             "report.html", "notes.txt"})
        touch(out_ / name);
    write_manifest({"maps/low.fits", "truth/index.fits", "truth/channels/low.fits", "report.html"});
    OutputFolder folder(out_, true);
    EXPECT_FALSE(fs::exists(out_ / "run.json"));
    EXPECT_FALSE(fs::exists(out_ / "maps/low.fits") || fs::exists(out_ / "truth") ||
                 fs::exists(out_ / "report.html"));
    EXPECT_TRUE(fs::exists(out_ / "maps/mine.fits") && fs::exists(out_ / "notes.txt"));
    folder.keep();
}

TEST_F(OutputFolders, ReplaceNeverLeavesItsFolder) {
    touch(folder_ / "precious");
    touch(folder_ / "elsewhere/precious");
    fs::create_directories(out_ / "maps");
    fs::create_directory_symlink(folder_ / "elsewhere", out_ / "link");
    write_manifest({"../precious", "maps/../../precious", (folder_ / "precious").string(), "", ".", "..",
                    "link/precious", "./../precious"});
    OutputFolder folder(out_, true);
    EXPECT_TRUE(fs::exists(folder_ / "precious"));
    EXPECT_TRUE(fs::exists(folder_ / "elsewhere/precious")) << "not through a symbolic link either";
    EXPECT_TRUE(fs::exists(out_));
    folder.keep();
}

TEST_F(OutputFolders, ABrokenManifestListsNothing) {
    touch(out_ / "maps/low.fits");
    for (const char* text : {"", "[]", "{\"outputs\": 3}", "{\"outputs\": [3, {\"name\": 7}, {}]}",
                             "{\"outputs\": [{\"name\": \"maps/low.fits\"}"}) {
        write_whole_file(out_ / "run.json", text);
        EXPECT_TRUE(list_manifest_outputs(out_ / "run.json").empty()) << text;
    }
    EXPECT_TRUE(list_manifest_outputs(out_ / "none.json").empty());
    const OutputFolder folder(out_, true);
    EXPECT_TRUE(fs::exists(out_ / "maps/low.fits"));
}

}  // namespace
}  // namespace foreglow
