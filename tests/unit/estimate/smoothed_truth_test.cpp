// SPDX-License-Identifier: GPL-2.0-or-later
#include "estimate/smoothed_truth.h"

#include <gtest/gtest.h>

#include <cmath>

#include "support/sky_builder.h"

namespace foreglow {
namespace {

PixelLaws make_laws(const HealpixGrid& grid, double index, double curvature) {
    PixelLaws laws;
    // Smooth enough for nside 16: the polynomial test brightness without its sharp plane.
    laws.brightness = {grid, Frame::Galactic, "K_RJ", testing::sample(grid, [](const Vector3& n) {
                           return 10 + 3 * n[0] + 2 * n[1] * n[2];
                       })};
    laws.index.assign(laws.brightness.values.size(), index);
    laws.curvature.assign(laws.brightness.values.size(), curvature);
    return laws;
}

TEST(SmoothLaws, KeepAUniformLaw) {
    const HealpixGrid grid(16);
    const PixelLaws out = smooth_laws(make_laws(grid, -2.7, -0.05), Angle::from_degrees(20), 32);
    for (std::size_t p = 0; p < out.index.size(); ++p) {
        EXPECT_NEAR(out.index[p], -2.7, 1e-6);
        EXPECT_NEAR(out.curvature[p], -0.05,
                    1e-5);  // a difference of two numbers near 7 with the a_lm's 1e-7
    }
}

TEST(SmoothLaws, MakeACurvatureOfMixedIndices) {
    // Half of the brightness with an index above, half below by the same: beta_s is the mean and c_s is half
    // their variance.
    const HealpixGrid grid(16);
    PixelLaws laws = make_laws(grid, -2.7, 0);
    for (double& value : laws.brightness.values)
        value = 10;
    for (std::size_t p = 0; p < laws.index.size(); ++p)
        laws.index[p] += grid.direction(static_cast<std::int64_t>(p))[2] > 0 ? 0.2 : -0.2;
    const PixelLaws out = smooth_laws(laws, Angle::from_degrees(30), 32);
    // On the equator, and far from it; the step in l <= 32 rings by a few times 1e-3 of 0.2 under a beam of
    // 30 deg.
    const auto equator = static_cast<std::size_t>(grid.pixel_at({1, 0, 0}));
    EXPECT_NEAR(out.index[equator], -2.7, 0.03);  // a pixel row is 3.6 deg wide
    EXPECT_NEAR(out.curvature[equator], 0.02, 0.002);
    EXPECT_NEAR(out.index[0], -2.5, 1e-3);
    EXPECT_NEAR(out.curvature[0], 0, 1e-3);
}

TEST(CarryLaws, IsTheLawAtAnotherFrequency) {
    PixelLaws laws = make_laws(HealpixGrid(1), -2.7, -0.05);
    const double before = laws.brightness.values[3];
    carry_laws(laws, 0.5);
    EXPECT_NEAR(laws.brightness.values[3], before * std::exp(-2.7 * 0.5 - 0.05 * 0.25), 1e-12);
    EXPECT_NEAR(laws.index[3], -2.7 - 2 * 0.05 * 0.5, 1e-15);
    EXPECT_EQ(laws.curvature[3], -0.05);
}

}  // namespace
}  // namespace foreglow
