// SPDX-License-Identifier: GPL-2.0-or-later
#include "picture/png.h"

#include <gtest/gtest.h>

#include "base/error.h"
#include "picture/colour_table.h"
#include "picture/ink.h"
#include "unit/picture/png_reader.h"

namespace foreglow {
namespace {

// From outside: Cairo's reader, which is libpng.
TEST(IndexedPng, IsReadBackAsWritten) {
    std::vector<Rgb> colours;
    for (int i = 0; i < 256; ++i)
        colours.push_back({static_cast<std::uint8_t>(i), static_cast<std::uint8_t>(255 - i),
                           static_cast<std::uint8_t>(7 * i)});
    for (const int width : {1, 7, 640}) {
        const int height = 33;
        std::vector<std::uint8_t> indices;
        for (int i = 0; i < width * height; ++i)
            indices.push_back(static_cast<std::uint8_t>(i % 5 == 0 ? i * i : i / 50));
        const auto png = testing::read_png(write_indexed_png(width, height, indices, colours));
        ASSERT_EQ(png.width, width);
        ASSERT_EQ(png.height, height);
        for (std::size_t i = 0; i < indices.size(); ++i)
            ASSERT_TRUE(png.pixels[i] == colours[indices[i]]);
    }
    EXPECT_THROW((void)write_indexed_png(2, 2, std::vector<std::uint8_t>(3), colours), ContractError);
}

TEST(ColourTable, HoldsWhatAPictureIsDrawnWith) {
    for (const PaletteKind kind : {PaletteKind::Sequential, PaletteKind::Diverging, PaletteKind::Grey}) {
        const Palette palette(kind);
        ColourTable table(palette);
        const auto distance = [&](Rgb c) {
            const Rgb found = table.colours()[table.nearest(c)];
            return std::max({std::abs(found.red - c.red), std::abs(found.green - c.green),
                             std::abs(found.blue - c.blue)});
        };
        EXPECT_EQ(distance(paper), 0);
        EXPECT_LE(distance(ink), 3);  // steps of 255; a cell is 4 wide
        EXPECT_LE(distance(undefined_colour), 3);
        EXPECT_LE(distance(not_positive_colour), 3);
        // Half a level of 160 (at most 256 * 3 / 160 / 2 summed over three parts) and a cell.
        for (int i = 0; i <= 1000; ++i)
            EXPECT_LE(distance(palette.at(i / 1000.0)), 5) << i;
        // Below a line of paper at 40 %: a tenth of the palette's steps.
        for (int i = 0; i <= 100; ++i)
            EXPECT_LE(distance(mix(palette.at(i / 100.0), paper, 0.4)), 10) << i;
    }
}

}  // namespace
}  // namespace foreglow
