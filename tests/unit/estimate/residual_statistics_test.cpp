// SPDX-License-Identifier: GPL-2.0-or-later
#include "estimate/residual_statistics.h"

#include <gtest/gtest.h>

#include <cmath>

#include "base/constants.h"
#include "sphere/gaussian_field.h"
#include "sphere/harmonics.h"
#include "sphere/power_spectrum.h"
#include "sphere/sky_map.h"

namespace foreglow {
namespace {

TEST(ResidualStatistics, AreThoseOfTheSelectedDefinedPixels) {
    const std::vector<double> values{5, -1, undefined_pixel, 3, 100, -7};
    const PixelSelection selection{1, 1, 1, 1, 0, 1};
    const ResidualStatistics s = make_residual_statistics(values, selection);
    EXPECT_EQ(s.pixels, 4);  // 5, -1, 3, -7
    EXPECT_DOUBLE_EQ(s.mean, 0);
    EXPECT_DOUBLE_EQ(s.rms, std::sqrt(84.0 / 4));
    EXPECT_DOUBLE_EQ(s.p50, 1);               // between -1 and 3
    EXPECT_NEAR(s.p5, -7 + 0.15 * 6, 1e-12);  // rank 0.15 of -7, -1, 3, 5
    EXPECT_NEAR(s.p95, 3 + 0.85 * 2, 1e-12);
    EXPECT_NEAR(s.p95_of_size, 5 + 0.85 * 2, 1e-12);  // of 1, 3, 5, 7
    EXPECT_EQ(make_residual_statistics(values, PixelSelection(6, 0)).pixels, 0);
}

TEST(MaskedSpectrum, IsThatOfTheFieldOnTheWholeSky) {
    const HealpixGrid grid(16);
    std::vector<double> cl(25, 0.0);
    for (std::size_t l = 1; l < cl.size(); ++l)
        cl[l] = 1.0 / static_cast<double>(l * l);
    const Alm alm = make_gaussian_alm(cl, 24, {3, 0, 0});
    const auto expected = power_spectrum(alm);
    const auto found = MaskedSpectra(grid, 24).of(synthesize(alm, grid), {});
    for (std::size_t l = 1; l < expected.size(); ++l)
        EXPECT_NEAR(found[l], expected[l],
                    1e-5);  // ring weights are nearly exact at 1.5 nside, and a refinement follows
}

TEST(MaskedSpectrum, KeepsThePowerOfNoiseUnderAMask) {
    const HealpixGrid grid(32);
    std::vector<double> values;
    for (std::int64_t p = 0; p < grid.npix(); ++p)
        values.push_back(normal_pair({1, 0, 0}, static_cast<std::uint32_t>(p), 0)[0]);
    const PixelSelection half = select_latitudes(grid, Frame::Galactic, 30);
    const auto cl = MaskedSpectra(grid, 48).of(values, half);
    double mean = 0, weight = 0;
    for (int l = 5; l <= 48; ++l) {
        mean += (2 * l + 1) * cl[static_cast<std::size_t>(l)];
        weight += 2 * l + 1;
    }
    // White noise of rms 1: C_l = 4 pi/npix. Half of 2400 modes is known to sqrt(2/1200) = 4 %; four of
    // these.
    EXPECT_NEAR(mean / weight / grid.pixel_area(), 1, 0.16);
}

TEST(SelectLatitudes, CountsHalfOfTheSkyBeyondThirtyDegrees) {
    const HealpixGrid grid(64);
    const PixelSelection selection = select_latitudes(grid, Frame::Galactic, 30);
    double kept = 0;
    for (const auto one : selection)
        kept += one;
    EXPECT_NEAR(kept / static_cast<double>(grid.npix()), 0.5, 0.01);  // rings of 0.9 deg
    EXPECT_TRUE(select_latitudes(grid, Frame::Icrs, 0).empty());
    const PixelSelection icrs = select_latitudes(grid, Frame::Icrs, 80);
    // The galactic pole is at (192.86, 27.13) deg of icrs.
    const double ra = 192.86 * constants::pi / 180, dec = 27.13 * constants::pi / 180;
    const auto pole =
        grid.pixel_at({std::cos(dec) * std::cos(ra), std::cos(dec) * std::sin(ra), std::sin(dec)});
    EXPECT_EQ(icrs[static_cast<std::size_t>(pole)], 1);
    EXPECT_EQ(icrs[0], 0);
}

TEST(LBands, CoverAllWithoutOverlap) {
    const auto bands = make_l_bands(128);
    ASSERT_EQ(bands.size(), 4U);
    EXPECT_EQ(bands[0].low, 2);
    for (std::size_t b = 1; b < bands.size(); ++b)
        EXPECT_EQ(bands[b].low, bands[b - 1].high + 1);
    EXPECT_EQ(bands.back().high, 128);
    EXPECT_TRUE(make_l_bands(1).empty());
    EXPECT_DOUBLE_EQ(rms_in_band(std::vector{9.0, 9.0, 4 * constants::pi, 9.0}, {2, 2}), std::sqrt(5.0));
}

}  // namespace
}  // namespace foreglow
