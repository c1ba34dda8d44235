// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/pixel_field.h"

#include <gtest/gtest.h>

#include <cmath>

#include "base/error.h"
#include "sphere/gaussian_field.h"
#include "sphere/regrid.h"
#include "support/sky_builder.h"

namespace foreglow {
namespace {

using testing::make_map;
using testing::same_bits;
using testing::whole_sky;

std::vector<double> evaluate(const PixelField& field, const HealpixGrid& grid, const RingStrip& strip) {
    std::vector<double> out(static_cast<std::size_t>(pixel_count(grid, strip)));
    field.evaluate(grid, strip, out);
    return out;
}

std::vector<double> evaluate_all(const PixelField& field, const HealpixGrid& grid) {
    return evaluate(field, grid, whole_sky(grid));
}

// The whole map put together from strips of about that many pixels.
std::vector<double> evaluate_by_strips(const PixelField& field, const HealpixGrid& grid,
                                       std::int64_t pixels) {
    std::vector<double> map(static_cast<std::size_t>(grid.npix()), -1e300);
    for (const RingStrip& strip : cut_into_strips(grid, pixels)) {
        const auto values = evaluate(field, grid, strip);
        for (const PixelRange& range : pixel_ranges(grid, strip))
            std::copy_n(values.begin() + range.offset, range.count, map.begin() + range.first_pixel);
    }
    return map;
}

double linear(const Vector3& n) {
    return 2 + n[0] - 0.5 * n[2];
}

TEST(PixelField, AUniformValueIsEverywhere) {
    const PixelField field = PixelField::uniform(-2.9);
    EXPECT_TRUE(field.is_uniform());
    EXPECT_EQ(field.range()->low, -2.9);
    EXPECT_EQ(field.range()->high, -2.9);
    EXPECT_EQ(evaluate_all(field, HealpixGrid(2)), std::vector<double>(48, -2.9));
}

TEST(PixelField, AMapOnTheGridIsUsedPixelForPixel) {
    const HealpixGrid grid(8);
    auto map = make_map(grid, linear);
    map->values[100] = undefined_pixel;
    for (const PixelField& field :
         {PixelField::of_map(map), PixelField::interpolated(map, grid, Frame::Galactic)}) {
        EXPECT_FALSE(field.is_uniform());
        EXPECT_TRUE(same_bits(evaluate_all(field, grid), map->values));
    }
    EXPECT_THROW((void)evaluate_all(PixelField::of_map(map), HealpixGrid(4)), ContractError);
}

TEST(PixelField, StripsOfAnySizeGiveTheSameSky) {
    const HealpixGrid grid(16);
    auto coarse = make_map(HealpixGrid(8), linear, Frame::Icrs);
    coarse->values[17] = undefined_pixel;
    auto filled = make_map(HealpixGrid(8), [](const Vector3& n) { return n[2] > 0.8 ? 1.0 : 0.0; });
    const Alm alm = make_gaussian_alm(std::vector<double>(33, 1.0), 32, {1, 0, 0});
    for (const std::int64_t pixels : {1, 100, 1000, 100000}) {
        for (const PixelField& field : {PixelField::uniform(3), PixelField::of_map(make_map(grid, linear)),
                                        PixelField::interpolated(coarse, grid, Frame::Galactic)})
            EXPECT_TRUE(same_bits(evaluate_by_strips(field, grid, pixels), evaluate_all(field, grid)));
        const PixelField harmonic = PixelField::harmonic(alm, Frame::Galactic, filled);
        const auto whole = evaluate_all(harmonic, grid), parts = evaluate_by_strips(harmonic, grid, pixels);
        EXPECT_EQ(testing::undefined_count(parts), testing::undefined_count(whole));
        EXPECT_LT(testing::relative_rms(parts, whole),
                  1e-13);  // rounding: strips cut underflowing terms elsewhere
    }
}

TEST(PixelField, InterpolationFollowsASmoothMapIntoAnotherFrame) {
    const HealpixGrid grid(16);
    const auto map = make_map(HealpixGrid(64), linear, Frame::Icrs);
    const auto values = evaluate_all(PixelField::interpolated(map, grid, Frame::Galactic), grid);
    const Matrix3 back = rotation_between(Frame::Galactic, Frame::Icrs);
    // Linear in the vector; worst between the four pixels around a pole, 0.0128 rad from it: 0.0128 (1 - cos
    // 45 deg) is lost.
    for (std::int64_t p = 0; p < grid.npix(); ++p)
        EXPECT_NEAR(values[static_cast<std::size_t>(p)], linear(rotate(back, grid.direction(p))), 3.8e-3);
}

TEST(PixelField, InterpolationLeavesUndefinedNeighboursOut) {
    const HealpixGrid grid(8);
    auto map = make_map(HealpixGrid(4), [](const Vector3& n) { return n[2] > 0 ? undefined_pixel : 5.0; });
    const auto values = evaluate_all(PixelField::interpolated(map, grid, Frame::Galactic), grid);
    for (std::int64_t p = 0; p < grid.npix(); ++p) {
        const double z = grid.direction(p)[2];
        const double value = values[static_cast<std::size_t>(p)];
        if (z > 0.2) {
            EXPECT_FALSE(is_defined(value));  // beyond one ring of nside 4 (dz = 1/6) from the edge
        } else if (z <= 0 || is_defined(value)) {
            EXPECT_NEAR(value, 5.0, 1e-14);  // weights are renormalised
        }
    }
}

TEST(PixelField, AHarmonicFieldIsTheMapOfItsCoefficients) {
    const HealpixGrid grid(8);
    const Alm alm = make_gaussian_alm(std::vector<double>(17, 1.0), 16, {2, 0, 0});
    const PixelField field = PixelField::harmonic(alm, Frame::Galactic);
    EXPECT_FALSE(field.range().has_value());
    EXPECT_LT(testing::relative_rms(evaluate_all(field, grid), synthesize(alm, grid)), 1e-14);
}

TEST(PixelField, AHarmonicFieldIsUndefinedWhereMoreThanAHundredthWasFilled) {
    const HealpixGrid grid(16);
    const auto filled = make_map(
        HealpixGrid(8), [](const Vector3& n) { return n[0] > 0.5 ? 1.0 : 0.0; }, Frame::Icrs);
    const auto values = evaluate_all(PixelField::harmonic(Alm(4), Frame::Galactic, filled), grid);
    const auto share = interpolate(*filled, grid, Frame::Galactic).values;
    std::int64_t expected = 0;
    for (std::size_t p = 0; p < values.size(); ++p) {
        EXPECT_EQ(is_defined(values[p]), share[p] <= 0.01);
        expected += share[p] > 0.01 ? 1 : 0;
    }
    EXPECT_GT(expected, 700);  // a cap of cos = 0.5 is a quarter of 3072 pixels
}

TEST(PixelField, RangeIsThatOfTheDefinedValues) {
    auto map = make_map(HealpixGrid(1), [](const Vector3&) { return undefined_pixel; });
    EXPECT_FALSE(PixelField::of_map(map).range().has_value());
    map->values[3] = -2.5;
    map->values[7] = -3.1;
    for (const PixelField& field :
         {PixelField::of_map(map), PixelField::interpolated(map, HealpixGrid(2), Frame::Galactic)}) {
        EXPECT_EQ(field.range()->low, -3.1);
        EXPECT_EQ(field.range()->high, -2.5);
    }
}

TEST(UndefineFilled, LooksAtTheShareAtEachPixel) {
    const HealpixGrid grid(2);
    const SkyMap filled{grid, Frame::Galactic, "", {}};
    SkyMap map = filled;
    map.values.assign(48, 0.0);
    map.values[5] = 1.0;
    map.values[6] = 0.01;  // not more than the largest share
    map.values[7] = 0.011;
    std::vector<double> values(48, 1.0);
    undefine_filled(map, grid, Frame::Galactic, whole_sky(grid), values);
    EXPECT_EQ(testing::undefined_count(values), 2);
    EXPECT_FALSE(is_defined(values[5]) || is_defined(values[7]));
}

}  // namespace
}  // namespace foreglow
