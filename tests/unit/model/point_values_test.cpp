// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/point_values.h"

#include <gtest/gtest.h>

#include <cmath>

#include "physics/band_law.h"
#include "physics/spectral_law.h"
#include "sphere/sky_map.h"

namespace foreglow {
namespace {

const Frequency nu0 = Frequency::from_hz(408e6);

SkyStrip make_strip() {
    SkyStrip strip;
    strip.intensity = {20, 5, undefined_pixel, 80};
    strip.index = {-2.7, -2.9, -2.5, -3.1};
    strip.curvature = {-0.04, 0.0, 0.01, -0.1};
    strip.q = {1, -2, 3, undefined_pixel};
    strip.u = {0.5, 2, -3, undefined_pixel};
    return strip;
}

TEST(PointValues, AreTheLawAtAFrequencyAndItsExactSumOverABand) {
    const SkyStrip strip = make_strip();
    const Frequency at = Frequency::from_ghz(30);
    const BandSum single = make_band_sum(Response::at(at), ResponseWeights::Temperature, {{}, at, 0, 0});
    const BandSum wide =
        make_band_sum(Response::flat(Frequency::from_ghz(25), Frequency::from_ghz(36)),
                      ResponseWeights::Radiance, {*find_brightness_unit("uK_CMB"), at, 0, 0});
    const double log_ratio = std::log(30e9 / 408e6);
    for (const BandSum& band : {single, wide}) {
        const PointValues values = make_point_values(strip, nu0, nu0, band, at);
        for (const std::size_t i : {0U, 1U, 3U}) {
            const double factor = exact_band_value(band, nu0, strip.index[i], strip.curvature[i]);
            // exp of an argument near -12: 12 roundings.
            EXPECT_NEAR(values.brightness[i], strip.intensity[i] * factor, 3e-15 * values.brightness[i]);
            EXPECT_EQ(values.index[i], strip.index[i] + 2 * strip.curvature[i] * log_ratio);
            EXPECT_EQ(values.electron_slope[i], electron_slope(values.index[i]));
            EXPECT_EQ(values.index_reference[i], strip.index[i]);
            if (i == 3) continue;
            EXPECT_NEAR(values.q[i], strip.q[i] * factor, 3e-15 * std::abs(values.q[i]));
            EXPECT_NEAR(values.u[i], strip.u[i] * factor, 3e-15 * std::abs(values.u[i]));
        }
        EXPECT_FALSE(is_defined(values.brightness[2]));
        EXPECT_FALSE(is_defined(values.q[3]));
    }
}

TEST(PointValues, GiveQAndUTheirOwnLaw) {
    SkyStrip strip = make_strip();
    strip.polarized_index = {-3, -3, -3, -3};
    strip.polarized_curvature = {0, 0, 0, 0};
    const Frequency at = Frequency::from_ghz(5);
    const Frequency own = Frequency::from_ghz(22.8);
    const BandSum band = make_band_sum(Response::at(at), ResponseWeights::Temperature, {{}, at, 0, 0});
    const PointValues values = make_point_values(strip, nu0, own, band, at);
    EXPECT_NEAR(values.q[0], std::pow(5 / 22.8, -3), 1e-13);  // some roundings of a number near 95
}

TEST(TakeMeans, GivesTheSlopeAndTheBendOfTheMeanBrightness) {
    const SkyStrip strip = make_strip();
    const PixelGroups groups{{0, 1, 2, 3}, {1, 2, 3, 0.5}, {0, 4}};
    const auto mean_at = [&](double hz) {
        const Frequency at = Frequency::from_hz(hz);
        const BandSum band = make_band_sum(Response::at(at), ResponseWeights::Temperature, {{}, at, 0, 0});
        return take_means(make_point_values(strip, nu0, nu0, band, at), groups);
    };
    const GroupedValues rows = mean_at(5e9);
    const double h = 1e-3;
    const double below = std::log(mean_at(5e9 * std::exp(-h)).values.brightness[0]);
    const double here = std::log(rows.values.brightness[0]);
    const double above = std::log(mean_at(5e9 * std::exp(h)).values.brightness[0]);
    EXPECT_EQ(rows.defined[0], 3);
    // Central differences: h^2 times derivatives of order 0.1, and rounding 1e-16/h^2 of the second.
    EXPECT_NEAR(rows.values.index[0], (above - below) / (2 * h), 1e-6);
    EXPECT_NEAR(rows.values.curvature[0], 0.5 * (above - 2 * here + below) / (h * h), 1e-6);
    EXPECT_NEAR(rows.values.electron_slope[0], -3 - 2 * rows.values.index[0], 1e-15);
    // At nu0 the weights are the amplitudes: (20 x -2.7 + 2 x 5 x -2.9 + 0.5 x 80 x -3.1)/70.
    EXPECT_NEAR(rows.values.index_reference[0], (-54.0 - 29.0 - 124.0) / 70, 1e-14);
}

TEST(TakeMeans, LeavesOutUndefinedPixelsAndCountsThem) {
    PointValues values;
    values.index = {-2.5, undefined_pixel, -2.7, undefined_pixel, undefined_pixel};
    const GroupedValues rows = take_means(values, {{0, 1, 2, 3, 4}, {}, {0, 3, 5, 5}});
    EXPECT_NEAR(rows.values.index[0], -2.6, 1e-15);
    EXPECT_NEAR(rows.scatter[0], 0.1, 1e-15);
    EXPECT_EQ(rows.defined, (std::vector<std::int64_t>{2, 0, 0}));
    EXPECT_FALSE(is_defined(rows.values.index[1]));
    EXPECT_FALSE(is_defined(rows.scatter[2]));
    EXPECT_TRUE(rows.values.brightness.empty());
}

TEST(TakeMeans, LeavesSinglePixelsAlone) {
    PointValues values;
    values.brightness = {-1.5, undefined_pixel};
    values.index = {-2.5, -2.6};
    const GroupedValues rows = take_means(values, {{7, 9}, {}, {}});
    EXPECT_EQ(rows.values.brightness[0], -1.5);
    EXPECT_EQ(rows.values.index, values.index);
}

}  // namespace
}  // namespace foreglow
