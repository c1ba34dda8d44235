// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/response_file.h"

#include <gtest/gtest.h>

#include <fstream>
#include <string>

#include "base/error.h"
#include "support/temporary_folder.h"

namespace foreglow {
namespace {

class TableFile : public ::testing::Test {
  protected:
    std::filesystem::path write(const std::string& text) {
        std::ofstream(folder_ / "t.csv") << text;
        return folder_ / "t.csv";
    }
    template <typename Read>
    std::string message_of(const std::string& text, const Read& read) {
        const std::filesystem::path path = write(text);
        try {
            (void)read(path);
        } catch (const DataError& error) {
            EXPECT_EQ(error.exit_status(), 1);
            return std::string(error.what()).substr(path.string().size());
        }
        return "";
    }
    std::string response_message(const std::string& text) { return message_of(text, read_response_file); }
    std::string window_message(const std::string& text) { return message_of(text, read_beam_window); }
    testing::TemporaryFolder folder_;
};
using ResponseFile = TableFile;
using BeamWindowFile = TableFile;

bool has(const std::string& message, const std::string& part) {
    return message.find(part) != std::string::npos;
}

TEST_F(ResponseFile, ReadsFrequenciesInTheHeadersUnit) {
    const ResponseTable table =
        read_response_file(write("frequency_MHz,transmission\n100,0\n100,1\n200,0.5\n200,0\n"));
    ASSERT_EQ(table.frequencies.size(), 4U);
    EXPECT_DOUBLE_EQ(table.frequencies[0].hz(), 100e6);
    EXPECT_EQ(table.frequencies[0], table.frequencies[1]);  // a step
    EXPECT_DOUBLE_EQ(table.frequencies[2].hz(), 200e6);
    EXPECT_EQ(table.transmission, (std::vector<double>{0, 1, 0.5, 0}));
    for (const char* unit : {"Hz", "kHz", "MHz", "GHz", "THz"})
        EXPECT_NO_THROW(
            (void)read_response_file(write(std::string("frequency_") + unit + ",transmission\n1,1\n2,1\n")))
            << unit;
}

TEST_F(ResponseFile, SaysWhichLineIsWrong) {
    const std::string head = "frequency_GHz,transmission\n";
    EXPECT_EQ(response_message("frequency,transmission\n1,1\n2,1\n").substr(0, 3), ":1:");
    EXPECT_EQ(response_message("frequency_GHz,power\n1,1\n2,1\n").substr(0, 3), ":1:");
    EXPECT_EQ(response_message("frequency_GHz,transmission,x\n1,1,1\n").substr(0, 3), ":1:");
    EXPECT_EQ(response_message(head + "2,1\n1,1\n").substr(0, 3), ":3:");
    EXPECT_EQ(response_message(head + "1,1\n2,-0.1\n").substr(0, 3), ":3:");
    EXPECT_EQ(response_message(head + "-1,1\n2,1\n").substr(0, 3), ":2:");
    EXPECT_EQ(response_message(head + "1,1\n2,1\n2,0.5\n2,0\n").substr(0, 3), ":5:");
    EXPECT_EQ(response_message(head + "1,nan\n2,1\n").substr(0, 3), ":2:");
    EXPECT_TRUE(has(response_message(head + "1,1\n"), "at least two rows"));
    EXPECT_TRUE(has(response_message(head + "1,0\n2,0\n"), "zero everywhere"));
    EXPECT_TRUE(has(response_message(head + "1,1\n1,1\n"), "span no frequency"));
    EXPECT_THROW((void)read_response_file(folder_ / "none.csv"), InputError);
}

TEST_F(ResponseFile, DemoResponseIsRight) {
    const ResponseTable table = read_response_file(std::filesystem::path(FOREGLOW_SOURCE_DIR) / "data-demo" /
                                                   "ridge-44-response.csv");
    EXPECT_DOUBLE_EQ(table.frequencies.front().ghz(), 38);
    EXPECT_DOUBLE_EQ(table.frequencies.back().ghz(), 50);
}

TEST_F(BeamWindowFile, ReadsOneOrTwoColumns) {
    const auto one = read_beam_window(write("l,B_l\n0,1\n1,0.9\n2,0.8\n"));
    EXPECT_EQ(one.lmax, 2);
    EXPECT_EQ(one.intensity, (std::vector<double>{1, 0.9, 0.8}));
    EXPECT_EQ(one.polarization, one.intensity);
    EXPECT_FALSE(one.has_polarization_column);
    const auto two = read_beam_window(write("ell,bl,BL_pol\n0,1,0\n1,0.9,0\n2,0.8,0.7\n"));
    EXPECT_EQ(two.polarization, (std::vector<double>{0, 0, 0.7}));
    EXPECT_TRUE(two.has_polarization_column);
}

TEST_F(BeamWindowFile, SaysWhichLineIsWrong) {
    EXPECT_EQ(window_message("l,window\n0,1\n").substr(0, 3), ":1:");
    EXPECT_EQ(window_message("l,B_l\n1,1\n").substr(0, 3), ":2:");
    EXPECT_EQ(window_message("l,B_l\n0,1\n2,1\n").substr(0, 3), ":3:");
    EXPECT_EQ(window_message("l,B_l\n0,1\n0.5,1\n").substr(0, 3), ":3:");
    EXPECT_EQ(window_message("l,B_l\n0,0\n1,1\n").substr(0, 3), ":2:");
    EXPECT_EQ(window_message("l,B_l\n0,1\n1,inf\n").substr(0, 3), ":3:");
    EXPECT_TRUE(has(window_message("l,B_l\n"), "no rows"));
}

}  // namespace
}  // namespace foreglow
