// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/galaxy_loops.h"

#include <gtest/gtest.h>

#include <cmath>

#include "base/constants.h"

namespace foreglow {
namespace {

constexpr double degree = constants::pi / 180;

GalaxyRay ray_to(double lon, double lat) {
    const double l = lon * degree;
    const double b = lat * degree;
    return {GalaxySpec(), {std::cos(b) * std::cos(l), std::cos(b) * std::sin(l), std::sin(b)}};
}

// A loop round the pole-less place l = 90, b = 0: angles from its centre are along the equator or across it.
GalaxyLoop plain_loop() {
    GalaxyLoop loop;
    loop.longitude = 90;
    loop.latitude = 0;
    loop.diameter = 60;
    loop.distance = 0.2;
    loop.thickness = 0.1;
    loop.brightness = 10;
    loop.bright_angle = 0;  // north
    loop.faint_side = 0.2;
    loop.contrast = 1;
    return loop;
}

TEST(GalaxyLoops, IsDarkOutsideAndBehind) {
    EXPECT_EQ(loop_light(plain_loop(), ray_to(90, 30.01)).brightness, 0);
    EXPECT_GT(loop_light(plain_loop(), ray_to(90, 29.99)).brightness, 0);
    EXPECT_EQ(loop_light(plain_loop(), ray_to(270, 0)).brightness, 0);
}

// From outside: the chord of a shell by counting points on the line of sight.
TEST(GalaxyLoops, BrightnessIsTheChord) {
    const GalaxyLoop loop = plain_loop();
    const double radius = 0.2 * std::sin(30 * degree);
    const auto chord = [&](double separation_deg) {
        double sum = 0;
        const double step = 1e-6;
        for (double d = 0.5 * step; d < 0.4; d += step) {
            const double r = std::sqrt(d * d + 0.04 - 0.4 * d * std::cos(separation_deg * degree));
            if (r < radius && r > 0.9 * radius) sum += step;
        }
        return sum;
    };
    const double longest = 2 * radius * std::sqrt(1 - 0.81);
    for (const double separation : {0.0, 12.0, 25.0, 28.0})
        EXPECT_NEAR(loop_light(loop, ray_to(90, separation)).brightness, 10 * chord(separation) / longest,
                    1e-3)  // two steps of 1e-6 at each of four edges, in 0.087
            << separation;
}

TEST(GalaxyLoops, BrightSideIsWhereTheAngleSays) {
    GalaxyLoop loop = plain_loop();
    const double north = loop_light(loop, ray_to(90, 20)).brightness;
    const double south = loop_light(loop, ray_to(90, -20)).brightness;
    EXPECT_NEAR(south / north, 0.2, 1e-12);
    loop.bright_angle = 90;  // through increasing longitude
    const double left = loop_light(loop, ray_to(110, 0)).brightness;
    EXPECT_GT(left, 4.9 * loop_light(loop, ray_to(70, 0)).brightness);  // 1/0.2, less a rounding
}

// The ambient field points to l = 80, b = 0; at the shell's edge towards the north it lies along the shell,
// unchanged, and E stands across it: Q > 0 where B is along east.
TEST(GalaxyLoops, PolarizationStandsAcrossTheField) {
    GalaxyLoop loop = plain_loop();
    loop.longitude = 350;  // the ambient field is then across the line of sight
    const LoopLight top = loop_light(loop, ray_to(350, 29.9));
    EXPECT_GT(top.q_share, 0.5);
    EXPECT_LT(std::abs(top.u_share), 0.1);
    EXPECT_LE(std::hypot(top.q_share, top.u_share), 0.75 + 1e-12);  // B^2/(B^2 + 1/3) <= 3/4
    // At the edge along the field, that is radial there, only what is across remains: nothing.
    const LoopLight side = loop_light(loop, ray_to(350 + 29.95, 0));
    EXPECT_LT(std::hypot(side.q_share, side.u_share), 0.35);
}

TEST(GalaxyLoops, SpectrumIsOneAt408MHzAndFalls) {
    const GalaxySpec galaxy;
    const std::vector<Frequency> frequencies{Frequency::from_hz(408e6), Frequency::from_ghz(23)};
    const LoopSpectra spectra(galaxy, GalaxyTable(galaxy), frequencies);
    ASSERT_EQ(spectra.ratio.size(), 4U);
    EXPECT_NEAR(spectra.ratio[0][0], 1, 1e-12);
    const double index = std::log(spectra.ratio[0][1]) / std::log(23e9 / 408e6);
    EXPECT_GT(index, -3.05);  // -2.8 to -3.05 between these two (common practice)
    EXPECT_LT(index, -2.8);
    EXPECT_GT(spectra.fraction[0][1], 0.72);  // s = 2.5 to 3.4 by (s + 1)/(s + 7/3)
    EXPECT_LT(spectra.fraction[0][1], 0.77);
}

}  // namespace
}  // namespace foreglow
