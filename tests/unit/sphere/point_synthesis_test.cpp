// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/point_synthesis.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>

#include "sphere/gaussian_field.h"
#include "sphere/patch_frame.h"

namespace foreglow {
namespace {

double rms(const std::vector<double>& values) {
    double sum = 0;
    for (const double v : values)
        sum += v * v;
    return std::sqrt(sum / static_cast<double>(values.size()));
}

// Against the transform at the centres of HEALPix pixels, at the pole, the equator and across phi = 0. All
// power at lmax, where the interpolation is worst.
TEST(PointSynthesis, AgreesWithTheTransformAtPixels) {
    const HealpixGrid grid(64);
    constexpr int lmax = 128;
    std::vector<double> cl(lmax + 1);
    cl[lmax] = 1;
    const Alm alm = make_gaussian_alm(cl, lmax, {1, 0, 1});
    const AlmEB eb{make_gaussian_alm(cl, lmax, {1, 0, 2}), make_gaussian_alm(cl, lmax, {1, 0, 3})};
    const auto map = synthesize(alm, grid);
    const StokesValues stokes = synthesize_spin2(eb, grid);
    for (const Vector3 center :
         {Vector3{0, 0, 1}, {0.1, 0.1, -0.99}, {1, 0, 0}, {-1, 0.02, 0.1}, {0.3, -0.6, 0.74}}) {
        std::vector<Vector3> directions;
        std::vector<std::size_t> pixels;
        for (std::int64_t p = 0; p < grid.npix(); ++p) {
            const Vector3 n = grid.direction(p);
            if (n[0] * center[0] + n[1] * center[1] + n[2] * center[2] < std::cos(0.15)) continue;
            directions.push_back(n);
            pixels.push_back(static_cast<std::size_t>(p));
        }
        ASSERT_GT(pixels.size(), 50U);
        const auto found = synthesize_at(alm, directions);
        const StokesValues polarized = synthesize_at(eb, directions);
        double worst = 0, worst_polarized = 0;
        for (std::size_t i = 0; i < pixels.size(); ++i) {
            worst = std::max(worst, std::abs(found[i] - map[pixels[i]]));
            worst_polarized = std::max({worst_polarized, std::abs(polarized.q[i] - stokes.q[pixels[i]]),
                                        std::abs(polarized.u[i] - stokes.u[pixels[i]])});
        }
        EXPECT_LT(worst / rms(map), 1e-3)
            << center[2];  // ten samples at six a wave: 1e-4 rms, the worst of many
        EXPECT_LT(worst_polarized / rms(stokes.q), 1e-3) << center[2];
    }
}

TEST(PatchFrame, PutsNorthUpAndLongitudeToTheLeft) {
    const PatchFrame patch(Angle::from_degrees(83), Angle::from_degrees(-41), Angle::from_degrees(0.5), 5);
    const auto n = patch.directions();
    const auto lon = [&](std::size_t i) { return std::atan2(n[i][1], n[i][0]) * 57.29577951308232; };
    const auto lat = [&](std::size_t i) { return std::asin(n[i][2]) * 57.29577951308232; };
    EXPECT_NEAR(lon(12), 83, 1e-12);
    EXPECT_NEAR(lat(12), -41, 1e-12);
    EXPECT_GT(lon(11), 83);                                                                    // left
    EXPECT_NEAR(lat(17) + 41, std::atan(0.5 / 57.29577951308232) * 57.29577951308232, 1e-12);  // up
    const auto wide = patch.with_margin(2).directions();
    EXPECT_NEAR(wide[2 * 9 + 2][0], n[0][0], 1e-15);
}

// At the centre's height, and at latitude b, the meridian d degrees east is turned by d sin b.
TEST(PatchFrame, KnowsHowMeridiansTurn) {
    const PatchFrame patch(Angle::from_degrees(40), Angle::from_degrees(60), Angle::from_degrees(0.2), 3);
    const Matrix3 same = rotation_between(Frame::Galactic, Frame::Galactic);
    const auto turns = patch.turns(same);
    EXPECT_NEAR(turns[4], 0, 1e-15);
    EXPECT_NEAR(turns[1], 0, 1e-12);  // along the meridian nothing turns
    const auto n = patch.directions();
    const double east = std::atan2(n[3][1], n[3][0]) * 57.29577951308232 - 40;
    // Walking east, one's own south is the carried one turned by - d sin b (towards west is negative).
    EXPECT_NEAR(std::abs(turns[3]), east / 57.29577951308232 * std::sin(60 / 57.29577951308232),
                1e-6);  // third order
    EXPECT_NEAR(turns[3], -turns[5], 1e-12);
    // Seen from a frame turned about the pole nothing changes.
    const double c = std::cos(1.0), s = std::sin(1.0);
    EXPECT_NEAR(patch.turns({{{c, -s, 0}, {s, c, 0}, {0, 0, 1}}})[3], turns[3], 1e-12);
}

}  // namespace
}  // namespace foreglow
