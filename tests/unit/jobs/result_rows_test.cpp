// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/result_rows.h"

#include <gtest/gtest.h>

#include <limits>

#include "base/error.h"

namespace foreglow {
namespace {

ResultRows make_rows() {
    ResultRows rows({"name", "value", "pixels"});
    rows.add({"a, \"b\"", 0.1, 3});
    rows.add({"c", std::numeric_limits<double>::quiet_NaN(), JsonValue()});
    return rows;
}

TEST(ResultRows, AlignATable) {
    EXPECT_EQ(make_rows().text(RowFormat::Table),
              "name    value  pixels\n"
              "a, \"b\"    0.1       3\n"
              "c           -       -\n");
}

TEST(ResultRows, WriteCsvWithQuotesWhereTheyAreNeeded) {
    EXPECT_EQ(make_rows().text(RowFormat::Csv), "name,value,pixels\n\"a, \"\"b\"\"\",0.1,3\nc,,\n");
}

TEST(ResultRows, WriteJsonWithNullForNoValue) {
    EXPECT_EQ(make_rows().text(RowFormat::Json),
              "[\n  {\n    \"name\": \"a, \\\"b\\\"\",\n    \"value\": 0.1,\n    \"pixels\": 3\n  },\n"
              "  {\n    \"name\": \"c\",\n    \"value\": null,\n    \"pixels\": null\n  }\n]\n");
    EXPECT_EQ(ResultRows({"a"}).text(RowFormat::Json), "[]\n");
}

TEST(ResultRows, RefuseARowOfAnotherLength) {
    ResultRows rows({"a"});
    EXPECT_THROW(rows.add({1, 2}), ContractError);
}

}  // namespace
}  // namespace foreglow
