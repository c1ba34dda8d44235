// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/beam.h"

#include <gtest/gtest.h>
#include <stdlib.h>

#include <filesystem>

#include "base/error.h"
#include "reference.h"

namespace foreglow {
namespace {

// From outside: healpy 1.16 gauss_beam(pol=True) and pixwin(pol=True), sphere_reference.py.
TEST(Beam, AgreesWithHealpy) {
    const auto table = reference::read_table("beams");
    const auto gauss = make_gaussian_beam(Angle::from_degrees(1.0), 128);
    const auto pixel = read_pixel_window(64, 128);
    ASSERT_EQ(gauss.lmax(), 128);
    for (std::size_t l = 0; l <= 128; ++l) {
        EXPECT_NEAR(gauss.temperature[l], table.at("gauss_t")[l], 1e-15);
        if (l >= 2) {
            EXPECT_NEAR(gauss.polarization[l], table.at("gauss_e")[l], 1e-15);
        }
        EXPECT_DOUBLE_EQ(pixel.temperature[l], table.at("pixel_t")[l]);  // the same file
        EXPECT_DOUBLE_EQ(pixel.polarization[l], table.at("pixel_p")[l]);
    }
    EXPECT_EQ(gauss.polarization[0], 0.0);
    EXPECT_EQ(gauss.polarization[1], 0.0);
}

TEST(Beam, WithoutWidthIsOne) {
    const auto beam = make_gaussian_beam({}, 4);
    EXPECT_EQ(beam.temperature, (std::vector<double>{1, 1, 1, 1, 1}));
    EXPECT_EQ(beam.polarization, (std::vector<double>{0, 0, 1, 1, 1}));
}

TEST(Beam, MultipliesAndCuts) {
    const auto beam =
        product(make_tabulated_beam({2, 3, 4}), make_tabulated_beam({1, 1, 1, 1}, {1, 1, 10, 1}));
    EXPECT_EQ(beam.temperature, (std::vector<double>{2, 3, 4}));
    EXPECT_EQ(beam.polarization, (std::vector<double>{0, 0, 40}));
    Alm t = reference::closed_alm(3, 0.0);
    const Alm before = t;
    apply_beam(beam, t);
    EXPECT_EQ(t(1, 1), 3.0 * before(1, 1));
    EXPECT_EQ(t(3, 0), 0.0);
    AlmEB eb = reference::closed_alm_eb(3);
    const AlmEB eb_before = eb;
    apply_beam(beam, eb);
    EXPECT_EQ(eb.b(2, 1), 40.0 * eb_before.b(2, 1));
    EXPECT_EQ(eb.e(3, 3), 0.0);
}

TEST(Beam, HighestLIsWhereItFallsBelowTheThreshold) {
    const auto beam = make_gaussian_beam(Angle::from_degrees(1.0), 4000);
    const int l = highest_l(beam);
    const auto i = static_cast<std::size_t>(l);
    EXPECT_GT(beam.polarization[i], 1e-7);
    EXPECT_LE(beam.polarization[i + 1], 1e-7);
    // sqrt(2 ln 1e7) / sigma
    EXPECT_NEAR(
        l, std::sqrt(2 * std::log(1e7)) / (Angle::from_degrees(1).radians() / std::sqrt(8 * std::log(2.0))),
        2);
    EXPECT_EQ(highest_l(make_gaussian_beam({}, 300)), 300);
    EXPECT_EQ(highest_l(make_tabulated_beam({0.0, 0.0})), 0);
}

TEST(PixelWindow, SaysWhatToInstallWhereTheTableIsMissing) {
    const char* before = getenv("FOREGLOW_HEALPIX_DATA");
    const std::string kept = before == nullptr ? "" : before;
    setenv("FOREGLOW_HEALPIX_DATA", "/nonexistent", 1);
    try {
        (void)read_pixel_window(64, 128);
        ADD_FAILURE() << "read a table that is not there";
    } catch (const InputError& error) {
        EXPECT_NE(std::string(error.what()).find("healpy-data"), std::string::npos);
        EXPECT_NE(std::string(error.what()).find("/nonexistent/pixel_window_n0064.fits"), std::string::npos);
    }
    if (kept.empty())
        unsetenv("FOREGLOW_HEALPIX_DATA");
    else
        setenv("FOREGLOW_HEALPIX_DATA", kept.c_str(), 1);
    EXPECT_THROW((void)read_pixel_window(1, 2), InputError);
    EXPECT_THROW((void)read_pixel_window(64, 257), InputError);
}

TEST(PixelWindow, ReportsABrokenTableWithoutChatter) {
    const auto folder = std::filesystem::temp_directory_path() / "foreglow-beam-test";
    std::filesystem::create_directories(folder);
    std::ofstream(folder / "pixel_window_n0064.fits") << "this is no FITS file";
    const char* before = getenv("FOREGLOW_HEALPIX_DATA");
    const std::string kept = before == nullptr ? "" : before;
    setenv("FOREGLOW_HEALPIX_DATA", folder.c_str(), 1);
    testing::internal::CaptureStderr();
    EXPECT_THROW((void)read_pixel_window(64, 128), DataError);
    EXPECT_EQ(testing::internal::GetCapturedStderr(), "");
    if (kept.empty())
        unsetenv("FOREGLOW_HEALPIX_DATA");
    else
        setenv("FOREGLOW_HEALPIX_DATA", kept.c_str(), 1);
    std::filesystem::remove_all(folder);
}

}  // namespace
}  // namespace foreglow
