// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/json_value.h"

#include <gtest/gtest.h>

#include <limits>

#include "base/error.h"
#include "support/messages.h"
#include "support/temporary_folder.h"

namespace foreglow {
namespace {

TEST(Json, KeepsTheOrderOfKeysAndIndentsByTwo) {
    const JsonValue::Object object{
        {"z", 1}, {"a", JsonValue::Array{true, "x", JsonValue()}}, {"m", JsonValue::Object{}}};
    EXPECT_EQ(write_json(object),
              "{\n  \"z\": 1,\n  \"a\": [\n    true,\n    \"x\",\n    null\n  ],\n  \"m\": {}\n}\n");
}

TEST(Json, WritesNumbersInTheirShortestForm) {
    EXPECT_EQ(write_json(0.1), "0.1\n");
    EXPECT_EQ(write_json(1e-5), "1e-05\n");
    EXPECT_EQ(write_json(std::int64_t{-9007199254740993}), "-9007199254740993\n");
    EXPECT_EQ(write_json(std::numeric_limits<std::uint64_t>::max()),
              "18446744073709551615\n");  // a seed may be that
    EXPECT_EQ(write_json(std::numeric_limits<double>::quiet_NaN()), "null\n");
    EXPECT_EQ(write_json(-std::numeric_limits<double>::infinity()), "null\n");
}

TEST(Json, EscapesTextAndSurvivesBytesThatAreNoUtf8) {
    EXPECT_EQ(write_json("a\"b\\c\n\x01"), "\"a\\\"b\\\\c\\n\\u0001\"\n");
    EXPECT_EQ(write_json("\xc3\xa9"), "\"\xc3\xa9\"\n");
    EXPECT_NO_THROW((void)write_json("\xff\xfe"));
}

TEST(Json, IsReadBackAsItWasWritten) {
    const testing::TemporaryFolder folder;
    const JsonValue::Object object{
        {"text", "\xc3\xa9 \"q\""}, {"whole", 7},
        {"real", -2.5e-300},        {"yes", false},
        {"none", JsonValue()},      {"list", JsonValue::Array{1, 2.5, JsonValue::Array{}}}};
    testing::write_whole_file(folder / "a.json", write_json(object));
    const JsonValue read = read_json(folder / "a.json");
    EXPECT_EQ(write_json(read), write_json(object));
    ASSERT_NE(read.find("text"), nullptr);
    EXPECT_EQ(*read.find("text")->text(), "\xc3\xa9 \"q\"");
    EXPECT_EQ(read.find("list")->array()->size(), 3U);
    EXPECT_TRUE(read.find("none")->is_null());
    EXPECT_EQ(read.find("other"), nullptr);
    EXPECT_EQ(read.find("whole")->find("x"), nullptr);
    EXPECT_EQ(read.find("whole")->text(), nullptr);
    EXPECT_EQ(read.array(), nullptr);
}

TEST(Json, SaysWhatIsWrongWithAFile) {
    const testing::TemporaryFolder folder;
    EXPECT_TRUE(testing::has(testing::message_of<FileError>([&] { return read_json(folder / "none.json"); }),
                             "none.json"));
    for (const char* text : {"", "{", "{\"a\":1,}", "{} {}", "nul"}) {
        testing::write_whole_file(folder / "bad.json", text);
        EXPECT_TRUE(
            testing::has(testing::message_of<DataError>([&] { return read_json(folder / "bad.json"); }),
                         "is no JSON file"))
            << text;
    }
}

TEST(Json, RefusesWhatIsNestedTooDeeplyToBeOurs) {
    const testing::TemporaryFolder folder;
    testing::write_whole_file(folder / "deep.json", std::string(1000000, '[') + std::string(1000000, ']'));
    EXPECT_THROW((void)read_json(folder / "deep.json"), DataError);
    testing::write_whole_file(folder / "fine.json", std::string(60, '[') + std::string(60, ']'));
    EXPECT_NO_THROW((void)read_json(folder / "fine.json"));
}

}  // namespace
}  // namespace foreglow
