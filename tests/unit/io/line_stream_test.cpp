// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/line_stream.h"

#include <gtest/gtest.h>

#include "base/error.h"
#include "support/messages.h"
#include "support/temporary_folder.h"

namespace foreglow {
namespace {

using testing::message_of;
using testing::TemporaryFolder;
using testing::write_whole_file;

TEST(LineStream, GivesEveryLineOfALongTextOnceWithItsPlace) {
    const TemporaryFolder folder;
    std::string text;
    constexpr int count = 300000;  // 2.4 MB: more than two pieces
    for (int i = 0; i < count; ++i)
        text += std::to_string(1000000 + i) + "\n";
    text += "last, without an end";
    write_whole_file(folder / "long.csv", text);
    LineStream stream(folder / "long.csv", "table");
    int number = 0;
    while (stream.next())
        for (std::size_t i = 0; i < stream.lines().size(); ++i) {
            const std::string expected =
                number < count ? std::to_string(1000000 + number) : "last, without an end";
            ASSERT_EQ(stream.lines()[i], expected);
            ++number;
            ASSERT_EQ(stream.place(i), (folder / "long.csv").string() + ":" + std::to_string(number));
        }
    EXPECT_EQ(number, count + 1);
}

TEST(LineStream, EndsAtOnceOnAnEmptyFileAndKeepsEmptyLines) {
    const TemporaryFolder folder;
    write_whole_file(folder / "empty.csv", "");
    LineStream empty(folder / "empty.csv", "table");
    EXPECT_FALSE(empty.next());
    write_whole_file(folder / "blank.csv", "\n\na\n");
    LineStream blank(folder / "blank.csv", "table");
    ASSERT_TRUE(blank.next());
    EXPECT_EQ(blank.lines(), (std::vector<std::string_view>{"", "", "a"}));
    EXPECT_FALSE(blank.next());
}

TEST(LineStream, RefusesFoldersMissingFilesAndEndlessLines) {
    const TemporaryFolder folder;
    const auto open = [](const std::filesystem::path& path) {
        return LineStream(path, "table").lines().size();
    };
    EXPECT_NE(message_of<InputError>([&] { return open(folder / "none.csv"); }).find("there is no table"),
              std::string::npos);
    EXPECT_NE(message_of<InputError>([&] { return open(folder.path()); }).find("is a folder"),
              std::string::npos);
    write_whole_file(folder / "endless.csv", "ok\n" + std::string(std::size_t{3} << 20, 'x'));
    LineStream stream(folder / "endless.csv", "table");
    ASSERT_TRUE(stream.next());
    EXPECT_NE(message_of<DataError>([&] { return stream.next(); }).find("endless.csv:2: "),
              std::string::npos);
}

}  // namespace
}  // namespace foreglow
