// SPDX-License-Identifier: GPL-2.0-or-later
#include "picture/palette.h"

#include <gtest/gtest.h>

#include <cmath>
#include <cstdlib>
#include <limits>

#include "base/error.h"

namespace foreglow {
namespace {

// From outside: sRGB red, lime and blue as the CSS Color 4 specification gives them in oklch() (from memory).
TEST(Colour, AgreesWithKnownOklabValues) {
    EXPECT_EQ(to_rgb({0.627955, 0.257683, 29.2339}), (Rgb{255, 0, 0}));
    EXPECT_EQ(to_rgb({0.866440, 0.294827, 142.4953}), (Rgb{0, 255, 0}));
    EXPECT_EQ(to_rgb({0.452014, 0.313214, 264.0520}), (Rgb{0, 0, 255}));
    EXPECT_EQ(to_rgb({1, 0, 0}), (Rgb{255, 255, 255}));
    EXPECT_EQ(to_rgb({0, 0, 0}), (Rgb{0, 0, 0}));
    EXPECT_NEAR(oklab_lightness({255, 0, 0}), 0.627955, 1e-5);  // the digits given
    EXPECT_NEAR(oklab_lightness({0, 0, 255}), 0.452014, 1e-5);
}

TEST(Colour, KeepsLightnessWhereAScreenLacksTheColour) {
    for (const double hue : {0.0, 70.0, 140.0, 210.0, 280.0}) {
        const Rgb rgb = to_rgb({0.6, 0.4, hue});
        EXPECT_NEAR(oklab_lightness(rgb), 0.6, 0.004)
            << hue;  // half a step of 8 bits is at most 0.004 in lightness
    }
}

TEST(Palette, SequentialGetsLighterAllTheWay) {
    const Palette palette(PaletteKind::Sequential);
    for (int i = 0; i <= 100; ++i) {
        const double expected = 0.20 + 0.76 * i / 100.0;
        // Half a step of 8 bits in each of three channels moves lightness by at most 0.006 in the darks.
        EXPECT_NEAR(oklab_lightness(palette.at(i / 100.0)), expected, 0.006) << i;
        if (i > 0) {
            EXPECT_GT(oklab_lightness(palette.at(i / 100.0)), oklab_lightness(palette.at((i - 1) / 100.0)));
        }
    }
}

TEST(Palette, DivergingIsLightestInTheMiddleAndEquallyDarkAtBothEnds) {
    const Palette palette(PaletteKind::Diverging);
    for (int i = 1; i <= 50; ++i)
        for (const int side : {-1, 1})
            EXPECT_LT(oklab_lightness(palette.at(0.5 + side * i / 100.0)),
                      oklab_lightness(palette.at(0.5 + side * (i - 1) / 100.0)))
                << side * i;
    EXPECT_NEAR(oklab_lightness(palette.at(0)), oklab_lightness(palette.at(1)), 0.01);  // two 8-bit roundings
    EXPECT_GT(palette.at(0).blue, palette.at(0).red + 50);
    EXPECT_GT(palette.at(1).red, palette.at(1).blue + 50);
}

TEST(Palette, FlatColoursAreFoundInNoPalette) {
    for (const PaletteKind kind : {PaletteKind::Sequential, PaletteKind::Diverging}) {
        const Palette palette(kind);
        for (int i = 0; i <= 1000; ++i)
            for (const Rgb flat : {undefined_colour, not_positive_colour}) {
                const Rgb c = palette.at(i / 1000.0);
                const int distance = std::abs(c.red - flat.red) + std::abs(c.green - flat.green) +
                                     std::abs(c.blue - flat.blue);
                EXPECT_GT(distance, 40) << i;  // of 765: a difference that anyone sees
            }
    }
}

TEST(Palette, TakesTheEndsBeyondTheRange) {
    const Palette palette(PaletteKind::Grey);
    EXPECT_EQ(palette.at(-3), palette.at(0));
    EXPECT_EQ(palette.at(std::numeric_limits<double>::infinity()), palette.at(1));
}

TEST(Palette, RefusesAnUnknownName) {
    EXPECT_EQ(parse_palette("diverging"), PaletteKind::Diverging);
    EXPECT_THROW((void)parse_palette("rainbow"), InputError);
}

}  // namespace
}  // namespace foreglow
