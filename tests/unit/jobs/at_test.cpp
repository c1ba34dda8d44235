// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/at.h"

#include <gtest/gtest.h>

#include <cmath>

#include "base/error.h"
#include "io/json_value.h"
#include "support/messages.h"
#include "support/sky_builder.h"

namespace foreglow {
namespace {

using namespace testing;

constexpr int nside = 8;

/// A model over the test sky, and the rows that are asked of it.
class AtTest : public ::testing::Test {
  protected:
    void SetUp() override {
        const HealpixGrid grid(nside);
        fits_map(nside, {sample(grid, test_brightness)}, "K_RJ").write(folder_ / "sky.fits");
        fits_map(nside, {sample(grid, test_index)}).write(folder_ / "index.fits");
        write_whole_file(folder_ / "model.toml",
                         "reference_frequency = \"408 MHz\"\n[intensity]\nmap = \"sky.fits\"\n[index]\nmap = "
                         "\"index.fits\"\n");
        options_.source = (folder_ / "model.toml").string();
        options_.frequencies = {"408 MHz"};
        options_.format = RowFormat::Csv;
    }
    // The text written; stops reading after some pieces.
    [[nodiscard]] std::string answer(int pieces = 1000000) {
        std::string text;
        notes_.clear();
        run_at(
            options_,
            [&](std::string_view piece) {
                text += piece;
                return --pieces > 0;
            },
            [&](const std::string& note) { notes_.push_back(note); });
        return text;
    }
    [[nodiscard]] std::string refusal() {
        return message_of<InputError>([&] { return answer(); });
    }
    [[nodiscard]] bool is_noted(const std::string& part) const {
        return std::any_of(notes_.begin(), notes_.end(),
                           [&](const std::string& note) { return note.find(part) != std::string::npos; });
    }

    TemporaryFolder folder_;
    AtOptions options_;
    std::vector<std::string> notes_;
};

TEST_F(AtTest, WritesJsonThatReadsBackAsOneArray) {
    options_.format = RowFormat::Json;
    options_.frequencies = {"100 MHz:10 GHz:3", "408 MHz"};
    options_.positions = {"10,20", "-0.5,-89"};
    write_whole_file(folder_ / "rows.json", answer());
    const JsonValue rows = read_json(folder_ / "rows.json");
    ASSERT_NE(rows.array(), nullptr);
    ASSERT_EQ(rows.array()->size(), 8U);
    const JsonValue& last = rows.array()->back();
    const HealpixGrid grid(nside);
    const auto pixel = std::get<std::uint64_t>(last.find("pixel")->storage());
    EXPECT_EQ(std::get<double>(last.find("brightness")->storage()),
              test_brightness(grid.direction(static_cast<std::int64_t>(pixel))));
    EXPECT_EQ(std::get<double>(last.find("lon_deg")->storage()), 359.5);
    EXPECT_TRUE(last.find("Q")->is_null());
    EXPECT_TRUE(is_noted("K_RJ"));
    EXPECT_TRUE(is_noted("nside 8"));
    options_.positions.clear();
    write_whole_file(folder_ / "none.csv", "lon_deg,lat_deg\n");
    options_.positions_file = folder_ / "none.csv";
    EXPECT_EQ(answer(), "[]\n");
}

TEST_F(AtTest, WritesTheSameRowsWhateverTheNumberOfThreadsAndBatches) {
    std::string table = "pixel\n";
    for (int i = 0; i < 200000; ++i)
        table += std::to_string(i * 7919 % 768) + "\n";
    write_whole_file(folder_ / "pixels.csv", table);
    options_.positions_file = folder_ / "pixels.csv";
    options_.nside = nside;
    const std::string rows = answer();
    EXPECT_EQ(std::count(rows.begin(), rows.end(), '\n'), 200001);
    // The first and the last row by themselves.
    options_.positions_file.reset();
    options_.pixels = {0, 199999 * 7919 % 768};
    const std::string ends = answer();
    const auto line = [](const std::string& text, std::size_t from) {
        return text.substr(from, text.find('\n', from) - from);
    };
    const std::size_t second = ends.find('\n') + 1;
    const std::size_t third = ends.find('\n', second) + 1;
    EXPECT_EQ(line(rows, rows.find('\n') + 1), line(ends, second));
    EXPECT_EQ(line(rows, rows.rfind('\n', rows.size() - 2) + 1), line(ends, third));
}

TEST_F(AtTest, StopsWhenNoOneReadsAnyMore) {
    std::string table;
    for (int i = 0; i < 300000; ++i)
        table += "10,20\n";
    table += "this line is never reached\n";
    write_whole_file(folder_ / "long.csv", "lon,lat\n" + table);
    options_.positions_file = folder_ / "long.csv";
    const std::string text = answer(2);
    EXPECT_LT(std::count(text.begin(), text.end(), '\n'), 10000);
    EXPECT_THROW(static_cast<void>(answer()), DataError);
}

TEST_F(AtTest, TakesHeaderlessTablesAndNamesWhatIsWrongInOne) {
    options_.positions_file = folder_ / "table.csv";
    write_whole_file(folder_ / "table.csv", "# a comment\n\n10,20\r\n370,20\n");
    EXPECT_NE(message_of<DataError>([&] { return answer(); }).find("table.csv:4: the longitude 370"),
              std::string::npos);
    write_whole_file(folder_ / "table.csv", "x,y\n1,2\n");
    EXPECT_NE(message_of<DataError>([&] { return answer(); }).find("lon_deg,lat_deg"), std::string::npos);
    write_whole_file(folder_ / "table.csv", "pixel\n1\n");
    EXPECT_NE(refusal().find("--nside"), std::string::npos);
    options_.nside = nside;
    write_whole_file(folder_ / "table.csv", "pixel\n768\n");
    EXPECT_NE(message_of<DataError>([&] { return answer(); }).find("no pixel 768"), std::string::npos);
}

TEST_F(AtTest, RefusesContradictions) {
    EXPECT_NE(refusal().find("say where to look"), std::string::npos);
    options_.positions = {"1,2"};
    options_.pixels = {3};
    EXPECT_NE(refusal().find("contradict"), std::string::npos);
    options_.pixels.clear();
    options_.interpolate = true;
    options_.disc = Angle::from_degrees(3);
    EXPECT_NE(refusal().find("contradict"), std::string::npos);
    options_.interpolate = false;
    options_.disc = Angle::from_degrees(-3);
    EXPECT_NE(refusal().find("--disc"), std::string::npos);
    options_.disc.reset();
    options_.nside = 16;
    EXPECT_NE(refusal().find("has nside 8"), std::string::npos);
    options_.nside.reset();
    options_.column = "INDEX";
    EXPECT_NE(refusal().find("index map"), std::string::npos);
    options_.column.reset();
    options_.frequencies = {"1 GHz:2 GHz:0"};
    EXPECT_NE(refusal().find("count"), std::string::npos);
    options_.frequencies = {"0.1 Hz"};
    EXPECT_NE(refusal().find("outside 1 Hz"), std::string::npos);
}

}  // namespace
}  // namespace foreglow
