// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/csv_table.h"

#include <gtest/gtest.h>

#include <fstream>
#include <string>

#include "base/error.h"
#include "support/temporary_folder.h"

namespace foreglow {
namespace {

class CsvTableTest : public ::testing::Test {
  protected:
    CsvTable read(const std::string& text) {
        std::ofstream(folder_ / "t.csv", std::ios::binary) << text;
        return read_csv_table(folder_ / "t.csv", "table", "a,b");
    }
    std::string message_of(const std::string& text) {
        try {
            (void)read(text);
        } catch (const DataError& error) {
            return std::string(error.what()).substr((folder_ / "t.csv").string().size());
        }
        return "";
    }
    testing::TemporaryFolder folder_;
};

TEST_F(CsvTableTest, ReadsNumbersUnderTheirHeader) {
    const CsvTable table =
        read("\xEF\xBB\xBF# comment\r\n\r\n a , \"b\"\r\n1, +2.5\r\n# in between\r\n-3e-2,4");
    EXPECT_EQ(table.header, (std::vector<std::string>{"a", "b"}));
    EXPECT_EQ(table.header_line, 3);
    ASSERT_EQ(table.rows.size(), 2U);
    EXPECT_EQ(table.rows[0], (std::vector<double>{1, 2.5}));
    EXPECT_EQ(table.rows[1], (std::vector<double>{-0.03, 4}));
    EXPECT_EQ(table.lines, (std::vector<int>{4, 6}));
}

TEST_F(CsvTableTest, SaysWhichLineIsWrong) {
    EXPECT_EQ(message_of("a,b\n1,2\n3\n").substr(0, 4), ":3: ");
    EXPECT_EQ(message_of("a,b\n1,2,3\n").substr(0, 4), ":2: ");
    EXPECT_EQ(message_of("a,b\n1,x\n").substr(0, 4), ":2: ");
    EXPECT_EQ(message_of("a,b\n1,\n").substr(0, 4), ":2: ");
    EXPECT_EQ(message_of("a,b\n1,nan\n").substr(0, 4), ":2: ");
    EXPECT_EQ(message_of("a,b\n1,inf\n").substr(0, 4), ":2: ");
    EXPECT_EQ(message_of("a,b\n1,1e999\n").substr(0, 4), ":2: ");
    EXPECT_EQ(message_of("a,b\n1,2 3\n").substr(0, 4), ":2: ");
    EXPECT_EQ(message_of("a,b\n1,0x10\n").substr(0, 4), ":2: ");
}

TEST_F(CsvTableTest, WantsAHeader) {
    EXPECT_EQ(message_of("1,2\n3,4\n").substr(0, 4), ":1: ");
    EXPECT_NE(message_of("1,2\n").find("a,b"), std::string::npos);
    EXPECT_EQ(message_of("").substr(0, 4), ":1: ");
    EXPECT_EQ(message_of("# only a comment\n").substr(0, 4), ":1: ");
}

TEST_F(CsvTableTest, RefusesFilesThatAreNotThere) {
    EXPECT_THROW((void)read_csv_table(folder_ / "none.csv", "table", "a,b"), InputError);
    EXPECT_THROW((void)read_csv_table(folder_.path(), "table", "a,b"), InputError);
}

}  // namespace
}  // namespace foreglow
