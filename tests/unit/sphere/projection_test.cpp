// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/projection.h"

#include <gtest/gtest.h>

#include <cmath>

#include "base/constants.h"
#include "base/error.h"
#include "sphere/grid.h"

namespace foreglow {
namespace {

Vector3 at(double lon, double lat) {
    return direction_of(Angle::from_degrees(lon), Angle::from_degrees(lat));
}

double distance(const Vector3& a, const Vector3& b) {
    return std::hypot(a[0] - b[0], a[1] - b[1], a[2] - b[2]);
}

TEST(Mollweide, HasLongitudeGrowingToTheLeftAndNorthUp) {
    const Mollweide sky;
    EXPECT_LT(sky.position_of(at(30, 0)).x, 0);
    EXPECT_GT(sky.position_of(at(330, 0)).x, 0);
    EXPECT_GT(sky.position_of(at(0, 30)).y, 0);
    EXPECT_NEAR(sky.position_of(at(90, 0)).x, -1.0, 1e-15);
    EXPECT_NEAR(sky.position_of(at(0, 90)).y, 1.0, 1e-15);
    EXPECT_NEAR(Mollweide(Angle::from_degrees(100)).position_of(at(100, 0)).x, 0.0, 1e-15);
}

// From outside: Snyder 1987, "Map projections: a working manual", table 41 (from memory): at latitude 50 deg,
// y is 0.65116 of the pole's, and the parallel is 0.75894 of the equator's length.
TEST(Mollweide, AgreesWithThePrintedTable) {
    const auto point = Mollweide().position_of(at(-90, 50));
    EXPECT_NEAR(point.y, 0.65116, 5e-5);
    EXPECT_NEAR(point.x, 0.75894, 5e-5);
}

TEST(Mollweide, ReturnsToEachPixel) {
    const HealpixGrid grid(16);
    for (const double lon : {0.0, 123.0}) {
        const Mollweide sky(Angle::from_degrees(lon));
        for (std::int64_t p = 0; p < grid.npix(); ++p) {
            const auto point = sky.position_of(grid.direction(p));
            ASSERT_LE(point.x * point.x / 4 + point.y * point.y, 1.0 + 1e-15);
            const auto back = sky.direction_at(point.x * (1 - 1e-15), point.y);
            ASSERT_TRUE(back.has_value());
            EXPECT_LT(distance(*back, grid.direction(p)), 1e-12);  // rounding of sin t near the poles
        }
    }
}

TEST(Mollweide, KeepsAreas) {
    // As many grid points of the picture fall in each cap of the sky as its area says.
    const Mollweide sky;
    int cap = 0, all = 0;
    for (double x = -1.9975; x < 2; x += 0.005)
        for (double y = -0.9975; y < 1; y += 0.005)
            if (const auto v = sky.direction_at(x, y)) {
                ++all;
                cap += (*v)[0] * 0.6 + (*v)[2] * 0.8 > 0.5;
            }
    EXPECT_NEAR(static_cast<double>(cap) / all, 0.25, 1e-3);  // the cap's edge over 2.5e5 cells
    EXPECT_FALSE(sky.direction_at(1.9, 0.5).has_value());
    EXPECT_FALSE(sky.direction_at(0.0, 1.0001).has_value());
}

TEST(Gnomonic, HasNorthUpEastLeftAndReturns) {
    const Gnomonic patch(Angle::from_degrees(83), Angle::from_degrees(-41));
    EXPECT_LT(patch.position_of(at(84, -41))->x, 0);
    EXPECT_GT(patch.position_of(at(83, -40))->y, 0);
    // From outside: the radius is tan of the distance (Snyder 1987, eq. 22-3 with k').
    EXPECT_NEAR(patch.position_of(at(83, -31))->y, std::tan(10 * constants::pi / 180), 1e-15);
    for (const double x : {-0.3, 0.0, 0.2})
        for (const double y : {-0.1, 0.4}) {
            const auto point = patch.position_of(*patch.direction_at(x, y));
            EXPECT_NEAR(point->x, x, 1e-15);
            EXPECT_NEAR(point->y, y, 1e-15);
        }
    EXPECT_FALSE(patch.position_of(at(263, 41)).has_value());
    EXPECT_THROW(Gnomonic({}, Angle::from_degrees(91)), ContractError);
}

TEST(Directions, ReturnToLongitudeAndLatitude) {
    EXPECT_NEAR(longitude_of(at(350, 20)).degrees(), 350, 1e-12);
    EXPECT_NEAR(latitude_of(at(350, -89.9999)).degrees(), -89.9999, 1e-12);
    EXPECT_EQ(longitude_of({1, -1e-20, 0}).degrees(), 0);  // never 360
}

}  // namespace
}  // namespace foreglow
