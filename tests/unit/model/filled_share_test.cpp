// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/filled_share.h"

#include <gtest/gtest.h>

#include <cmath>

#include "support/sky_builder.h"

namespace foreglow {
namespace {

using testing::sample;

constexpr double pi = 3.14159265358979323846;

double sigma_of(Angle fwhm) {
    return fwhm.radians() / std::sqrt(8 * std::log(2.0));
}

// The oracle: the Gaussian's weight on filled pixels by a sum over the points of a grid 8 times finer.
double share_by_sum(const HealpixGrid& grid, const std::vector<double>& values, const Vector3& at,
                    double sigma) {
    const HealpixGrid fine(8 * grid.nside());
    double filled = 0, all = 0;
    for (std::int64_t p = 0; p < fine.npix(); ++p) {
        const Vector3 n = fine.direction(p);
        const double cosine = n[0] * at[0] + n[1] * at[1] + n[2] * at[2];
        const double distance = std::acos(std::min(1.0, cosine));
        if (distance > 6 * sigma) continue;
        const double weight = std::exp(-0.5 * distance * distance / (sigma * sigma));
        all += weight;
        if (!is_defined(values[static_cast<std::size_t>(grid.pixel_at(n))])) filled += weight;
    }
    return filled / all;
}

TEST(FilledShare, IsTheWeightOfTheBeamOnFilledPixels) {
    const HealpixGrid grid(8);
    auto values = sample(grid, [](const Vector3& n) {
        return n[2] > 0.85 || std::abs(n[0] + 0.7) < 0.05 ? undefined_pixel : 1.0;
    });
    values[380] = undefined_pixel;  // a lone one
    for (const double degrees : {16.0, 30.0}) {
        const Angle fwhm = Angle::from_degrees(degrees);
        const FilledShare share(grid, Frame::Galactic, values, fwhm);
        ASSERT_TRUE(share.any());
        const auto found = share.under_beam(fwhm, Frame::Galactic);
        double worst = 0, worst_near_threshold = 0;
        for (std::int64_t p = 0; p < grid.npix(); p += 11) {
            const double expected = share_by_sum(grid, values, grid.direction(p), sigma_of(fwhm));
            const double error = std::abs(found[static_cast<std::size_t>(p)] - expected);
            worst = std::max(worst, error);
            if (expected < 0.05) worst_near_threshold = std::max(worst_near_threshold, error);
        }
        EXPECT_LT(worst_near_threshold, 3e-3);  // 2e-3 promised near 1 %, and the oracle's own sum
        EXPECT_LT(worst, 1.5e-2);  // 1e-2 promised, and sigma^2/6 of the oracle's flat-sky Gaussian
    }
}

TEST(FilledShare, TurnsWithTheFrame) {
    const HealpixGrid grid(16);
    const auto values = sample(grid, [](const Vector3& n) { return n[2] > 0.7 ? undefined_pixel : 1.0; });
    const Angle fwhm = Angle::from_degrees(10);
    const FilledShare share(grid, Frame::Galactic, values, fwhm);
    const auto turned = share.under_beam(fwhm, Frame::Icrs);
    const Matrix3 back = rotation_between(Frame::Icrs, Frame::Galactic);
    for (std::int64_t p = 0; p < grid.npix(); ++p) {
        const double z = rotate(back, grid.direction(p))[2];
        const double from_edge = std::acos(z) - std::acos(0.7);
        if (from_edge > 3.5 * sigma_of(fwhm)) {
            EXPECT_LT(turned[static_cast<std::size_t>(p)],
                      0.004);  // tail 2e-4, pixel shapes, 2e-3 of accuracy
        } else if (from_edge < -3.5 * sigma_of(fwhm)) {
            EXPECT_GT(turned[static_cast<std::size_t>(p)], 0.985);  // 1e-2 of accuracy where all is filled
        }
    }
}

TEST(FilledShare, OfACompleteMapIsNone) {
    EXPECT_FALSE(
        FilledShare(HealpixGrid(2), Frame::Galactic, std::vector<double>(48, 1.0), Angle::from_degrees(5))
            .any());
}

TEST(EquivalentFwhm, OfAGaussianIsItsOwn) {
    const HealpixGrid grid(64);
    for (const double degrees : {2.0, 5.0, 20.0}) {
        const BeamWindow beam = make_gaussian_beam(Angle::from_degrees(degrees), 192);
        // The window is looked at at whole l only: half falls at l = 1.2 times 180/fwhm deg or so, and the
        // next l is taken.
        const double half_l = 0.5 * 187 / degrees;
        EXPECT_NEAR(equivalent_fwhm(beam, grid).degrees(), degrees, degrees / half_l + 1e-9);
        EXPECT_LE(equivalent_fwhm(beam, grid).degrees(), degrees * (1 + 1e-12));
    }
}

TEST(EquivalentFwhm, ContinuesAWindowThatEndsEarly) {
    const BeamWindow beam = make_gaussian_beam(Angle::from_degrees(2), 40);  // still 0.84 at its end
    EXPECT_NEAR(equivalent_fwhm(beam, HealpixGrid(64)).degrees(), 2, 1e-9);
}

TEST(EquivalentFwhm, IsNeverBelowAPixel) {
    const HealpixGrid grid(16);
    const double pixel = std::sqrt(4 * pi / 3072);
    EXPECT_NEAR(equivalent_fwhm(make_gaussian_beam(Angle(), 32), grid).radians(), pixel, 1e-14);
    EXPECT_NEAR(equivalent_fwhm(make_gaussian_beam(Angle::from_degrees(1), 32), grid).radians(), pixel,
                1e-14);
}

}  // namespace
}  // namespace foreglow
