// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/disc.h"

#include <gtest/gtest.h>

#include <cmath>

#include "sphere/sky_position.h"

namespace foreglow {
namespace {

// The definition itself, pixel by pixel: the angle by atan2, which is exact for small and large ones.
std::vector<std::int64_t> by_definition(const HealpixGrid& grid, const Vector3& a, double radius) {
    std::vector<std::int64_t> pixels;
    for (std::int64_t p = 0; p < grid.npix(); ++p) {
        const Vector3 b = grid.direction(p);
        const Vector3 cross{a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]};
        const double sine = std::hypot(cross[0], cross[1], cross[2]);
        const double cosine = a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
        if (std::atan2(sine, cosine) <= radius) pixels.push_back(p);
    }
    return pixels;
}

TEST(PixelsInDisc, AreThoseWhoseCentresAreWithinTheRadius) {
    const HealpixGrid grid(16);
    for (const double lon : {0.0, 0.3, 123.4, 359.9})
        for (const double lat : {-90.0, -88.0, -41.0, 0.0, 35.2, 89.0, 90.0})
            for (const double radius : {0.7, 3.3, 12.1, 91.7, 170.2}) {
                const Vector3 center = direction_of({lon, lat});
                EXPECT_EQ(pixels_in_disc(grid, center, Angle::from_degrees(radius)),
                          by_definition(grid, center, Angle::from_degrees(radius).radians()))
                    << lon << " " << lat << " " << radius;
            }
}

TEST(PixelsInDisc, AreNoneInADiscBetweenCentresAndAllInTheWholeSky) {
    const HealpixGrid grid(4);
    EXPECT_TRUE(pixels_in_disc(grid, {0, 0, 1}, Angle::from_degrees(1)).empty());
    EXPECT_EQ(pixels_in_disc(grid, direction_of({40, 50}), Angle::from_degrees(180)).size(), 192U);
}

}  // namespace
}  // namespace foreglow
