// SPDX-License-Identifier: GPL-2.0-or-later
#include "picture/sky_raster.h"

#include <gtest/gtest.h>

#include <cmath>
#include <functional>
#include <numbers>

#include "base/parallel.h"
#include "sphere/projection.h"

namespace foreglow {
namespace {

SkyMap make_map(int nside, const std::function<double(const Vector3&)>& law) {
    SkyMap map{HealpixGrid(nside), Frame::Galactic, "K_RJ", {}};
    for (std::int64_t p = 0; p < map.grid.npix(); ++p)
        map.values.push_back(law(map.grid.direction(p)));
    return map;
}

/// A map that is 1 in the pixel at a place and 0 elsewhere.
SkyMap make_beacon(int nside, double longitude, double latitude) {
    SkyMap map = make_map(nside, [](const Vector3&) { return 0.0; });
    const Vector3 at = direction_of(Angle::from_degrees(longitude), Angle::from_degrees(latitude));
    map.values[static_cast<std::size_t>(map.grid.pixel_at(at))] = 1;
    return map;
}

PlanePoint centroid(const SkyRaster& raster) {
    double x = 0, y = 0, sum = 0;
    for (int j = 0; j < raster.height; ++j)
        for (int i = 0; i < raster.width; ++i) {
            const double v =
                raster.values[static_cast<std::size_t>(j) * static_cast<std::size_t>(raster.width) + i];
            if (!is_defined(v)) continue;
            x += v * (i + 0.5);
            y += v * (j + 0.5);
            sum += v;
        }
    return {x / sum, y / sum};
}

// nside 32 on 720 x 360 is sampled, nside 512 is averaged: both ways must put a place where the projection
// does.
TEST(AllSkyRaster, PutsPositiveLongitudesLeftAndNorthUp) {
    for (const int nside : {32, 512}) {
        // Half a pixel of the map and half of the picture, in picture pixels: 2 deg are 4 of them at
        // nside 32.
        const double tolerance = nside == 32 ? 3.0 : 1.0;
        const auto left = centroid(make_all_sky_raster(make_beacon(nside, 60, 0), 720, 360));
        EXPECT_NEAR(left.x, 360 - 360 * 60 / 180.0, tolerance) << nside;
        EXPECT_NEAR(left.y, 180, tolerance);
        const auto right = centroid(make_all_sky_raster(make_beacon(nside, 300, 0), 720, 360));
        EXPECT_NEAR(right.x, 360 + 360 * 60 / 180.0, tolerance);
        const auto north = centroid(make_all_sky_raster(make_beacon(nside, 0, 45), 720, 360));
        // 2 t + sin 2t = pi sin 45 deg has the root t = 0.63362 (by hand).
        EXPECT_NEAR(north.y, 180 * (1 - std::sin(0.63362)), tolerance);
        EXPECT_NEAR(north.x, 360, tolerance);
    }
}

TEST(AllSkyRaster, ShowsASmoothSkyAsTheProjectionSays) {
    const auto law = [](const Vector3& v) { return v[0] + 2 * v[1] + 3 * v[2]; };
    for (const int nside : {128, 512}) {
        const SkyRaster raster = make_all_sky_raster(make_map(nside, law), 720, 360);
        const Mollweide projection;
        double worst = 0;
        int seen = 0;
        for (int j = 0; j < 360; ++j)
            for (int i = 0; i < 720; ++i) {
                const auto v = projection.direction_at(4 * (i + 0.5) / 720 - 2, 1 - 2 * (j + 0.5) / 360);
                const double shown =
                    raster.values[static_cast<std::size_t>(j) * 720 + static_cast<std::size_t>(i)];
                if (!v) continue;
                ASSERT_TRUE(is_defined(shown)) << i << " " << j;
                ++seen;
                // Near the rim a picture pixel spans many degrees, for the projection squeezes longitudes
                // there.
                if (std::hypot(2 * (i + 0.5) / 720 - 1, 1 - 2 * (j + 0.5) / 360) < 0.95)
                    worst = std::max(worst, std::abs(shown - law(*v)));
            }
        EXPECT_GT(seen, 200000);  // pi/4 of 720 x 360
        // The law changes by at most sqrt(14) a radian; a picture pixel is 0.5 deg wide at the centre and
        // spans up to 1 deg where latitudes are squeezed, a map pixel of nside 128 0.46 deg: half of both
        // together is 0.013 rad.
        EXPECT_LT(worst, std::sqrt(14.0) * 0.013) << nside;
    }
}

TEST(AllSkyRaster, KeepsAreas) {
    // A quarter of the sky is above z = 0.5; the projection is of equal area, so a quarter of the ellipse
    // shows it.
    const auto map = make_map(512, [](const Vector3& v) { return v[2] > 0.5 ? 1.0 : 0.0; });
    const SkyRaster raster = make_all_sky_raster(map, 720, 360);
    double above = 0, all = 0;
    for (const double v : raster.values)
        if (is_defined(v)) {
            above += v;
            all += 1;
        }
    EXPECT_NEAR(above / all, 0.25, 0.003);  // one row of pixels along the edge is 0.5 %, known to a half
}

TEST(AllSkyRaster, SaysWhichShareIsUndefined) {
    const auto map = make_map(64, [](const Vector3& v) { return v[2] < 0 ? undefined_pixel : 1.0; });
    const SkyRaster raster = make_all_sky_raster(map, 720, 360);
    EXPECT_EQ(raster.undefined_shares[90 * 720 + 360], 0.0F);
    EXPECT_EQ(raster.values[90 * 720 + 360], 1.0);
    EXPECT_EQ(raster.undefined_shares[270 * 720 + 360], 1.0F);
    EXPECT_FALSE(is_defined(raster.values[270 * 720 + 360]));
    EXPECT_EQ(raster.undefined_shares[0], 0.0F);  // outside the ellipse there is no sky
    EXPECT_FALSE(is_defined(raster.values[0]));
}

TEST(AllSkyRaster, IsTheSameForAnyNumberOfThreads) {
    const auto map = make_map(256, [](const Vector3& v) { return std::sin(9 * v[0]) + v[1]; });
    const int before = thread_count();
    set_thread_count(1);
    const auto one = make_all_sky_raster(map, 300, 150),
               close_one = make_close_up_raster(map, {}, {}, Angle::from_degrees(9), 90);
    set_thread_count(3);
    const auto three = make_all_sky_raster(map, 300, 150),
               close_three = make_close_up_raster(map, {}, {}, Angle::from_degrees(9), 90);
    set_thread_count(before);
    for (std::size_t i = 0; i < one.values.size(); ++i)
        ASSERT_TRUE(one.values[i] == three.values[i] ||
                    (std::isnan(one.values[i]) && std::isnan(three.values[i])));
    EXPECT_EQ(close_one.values, close_three.values);
}

TEST(CloseUpRaster, HasNorthUpAndLongitudeGrowingLeft) {
    const Angle longitude = Angle::from_degrees(80), latitude = Angle::from_degrees(-30),
                size = Angle::from_degrees(10);
    // 10 deg across 200 pixels: 2 deg are 40 pixels along a meridian; a map pixel of nside 256 is 0.23 deg
    // or 4.6 pixels.
    const auto north =
        centroid(make_close_up_raster(make_beacon(256, 80, -28), longitude, latitude, size, 200));
    EXPECT_NEAR(north.x, 100, 4);
    EXPECT_NEAR(north.y, 60, 4);
    const auto east =
        centroid(make_close_up_raster(make_beacon(256, 82, -30), longitude, latitude, size, 200));
    EXPECT_NEAR(east.x, 100 - 40 * std::cos(30 * std::numbers::pi / 180), 4);
    EXPECT_NEAR(east.y, 100, 4);
}

}  // namespace
}  // namespace foreglow
