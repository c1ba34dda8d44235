// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/fits_image_write.h"

#include <gtest/gtest.h>

#include <cmath>
#include <fstream>
#include <limits>
#include <sstream>

#include "base/error.h"

namespace foreglow {
namespace {

std::string bytes_of(const std::filesystem::path& path) {
    std::ifstream file(path, std::ios::binary);
    std::stringstream text;
    text << file.rdbuf();
    return text.str();
}

// astropy reads such files, checksums included, in tests/end_to_end/patches.py.
TEST(FitsImageWrite, WritesWholeBlocksAndTheSameBytesAgain) {
    const std::filesystem::path folder = std::filesystem::path(testing::TempDir()) / "foreglow_image";
    std::filesystem::create_directories(folder);
    FitsImageLayout layout;
    layout.axes = {3, 2};
    layout.cards = {{"CRVAL1", 0.1, "[deg]"}, {"CTYPE1", std::string("RA---TAN"), ""}};
    const std::vector<double> values{1, 2, 3, 4, std::numeric_limits<double>::quiet_NaN(), 6};
    write_fits_image(folder / "a.fits", layout, values);
    write_fits_image(folder / "b.fits", layout, values);
    const std::string a = bytes_of(folder / "a.fits");
    EXPECT_EQ(a.size(), 2 * 2880U);
    EXPECT_EQ(a, bytes_of(folder / "b.fits"));
    EXPECT_NE(a.find("CRVAL1  =                  0.1 / [deg]"), std::string::npos);
    EXPECT_EQ(a.substr(2880, 4), std::string("\x3f\x80\x00\x00", 4));  // 1.0f, big-endian
    // The ones' complement sum of all words is -0 where CHECKSUM is right (FITS 4.0, section 4.4.2.7).
    std::uint64_t sum = 0;
    for (std::size_t i = 0; i < a.size(); i += 4) {
        std::uint64_t word = 0;
        for (std::size_t k = 0; k < 4; ++k)
            word = word << 8U | static_cast<unsigned char>(a[i + k]);
        sum += word;
    }
    while (sum >> 32U)
        sum = (sum & 0xffffffffU) + (sum >> 32U);
    EXPECT_EQ(sum, 0xffffffffU);
    layout.float64 = true;
    EXPECT_GE(fits_image_file_bytes(layout), 48);
    EXPECT_THROW(write_fits_image(folder / "missing" / "c.fits", layout, values), FileError);
    std::filesystem::remove_all(folder);
}

}  // namespace
}  // namespace foreglow
