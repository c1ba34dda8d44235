// SPDX-License-Identifier: GPL-2.0-or-later
#include "picture/sky_lattice.h"

#include <gtest/gtest.h>

#include <cmath>

#include "sphere/projection.h"

namespace foreglow {
namespace {

// Oracle: the projection and HEALPix's vec2pix, place by place.
TEST(SkyLattice, FindsThePixelUnderEachPlaceAsTheProjectionDoes) {
    constexpr int width = 300, height = 150;
    for (const int nside : {1, 8, 128}) {
        const HealpixGrid grid(nside);
        std::vector<std::int32_t> pixels(4 * width);
        int inside = 0, differing = 0;
        for (int j = 0; j < height; ++j) {
            SkyLattice::locate_row(grid, width, height, j, pixels);
            for (int b = 0; b < 2; ++b)
                for (int k = 0; k < 2 * width; ++k) {
                    const double x = 4 * (k + 0.5) / (2 * width) - 2,
                                 y = 1 - 2 * (j + (b + 0.5) / 2) / height;
                    const auto direction = Mollweide().direction_at(x, y);
                    const std::int32_t found = pixels[static_cast<std::size_t>(b * 2 * width + k)];
                    ASSERT_EQ(found != SkyLattice::outside, direction.has_value()) << j << ' ' << k;
                    if (!direction) continue;
                    ++inside;
                    differing += found != grid.pixel_at(*direction) ? 1 : 0;
                }
        }
        // Places on the edge of two pixels may go either way by rounding.
        EXPECT_LE(differing, inside / 1000) << nside;
    }
}

TEST(SkyLattice, GivesTheRasterOfAMap) {
    const HealpixGrid grid(32);
    SkyMap map{grid, Frame::Galactic, "K_RJ", {}};
    for (std::int64_t p = 0; p < grid.npix(); ++p)
        map.values.push_back(p % 17 == 0 ? undefined_pixel : static_cast<double>(p));
    const SkyRaster expected = make_all_sky_raster(map, 400, 200),
                    found = SkyLattice(grid, 400, 200).sample(map);
    EXPECT_EQ(found.undefined_shares, expected.undefined_shares);
    for (std::size_t i = 0; i < found.values.size(); ++i)
        ASSERT_TRUE(found.values[i] == expected.values[i] ||
                    (std::isnan(found.values[i]) && std::isnan(expected.values[i])));
}

}  // namespace
}  // namespace foreglow
