// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/map_pieces.h"

#include <gtest/gtest.h>

#include "support/sky_builder.h"

namespace foreglow {
namespace {

TEST(MapPieces, CoverEveryPixelOfTheStripsOnce) {
    for (const int nside : {1, 16, 128})
        for (const std::int64_t pixels : {std::int64_t{1} << 22, std::int64_t{5000}}) {
            const HealpixGrid grid(nside);
            std::vector<int> seen(static_cast<std::size_t>(grid.npix()), 0);
            for (const RingStrip& strip : cut_into_strips(grid, pixels)) {
                std::size_t next = 0;
                for (const MapPiece& piece : cut_into_pieces(grid, strip)) {
                    EXPECT_EQ(piece.begin, next);  // the buffer in order, without a gap
                    EXPECT_GT(piece.size(), 0U);
                    EXPECT_LE(piece.size(), 16384U);
                    next = piece.end;
                    for (std::size_t i = 0; i < piece.size(); ++i)
                        ++seen[static_cast<std::size_t>(piece.first_pixel) + i];
                }
                EXPECT_EQ(static_cast<std::int64_t>(next), pixel_count(grid, strip));
            }
            EXPECT_EQ(seen, std::vector<int>(seen.size(), 1));
        }
}

// A preview shows, at each of its own pixels, the map's pixel that holds that centre.
TEST(PreviewSampler, TakesThePixelAtEachCentre) {
    for (const int nside : {4, 128, 256, 512}) {
        const HealpixGrid grid(nside), small(std::min(nside, 128));
        std::vector<double> a, b;
        for (std::int64_t p = 0; p < grid.npix(); ++p) {
            a.push_back(static_cast<double>(p));
            b.push_back(-static_cast<double>(p));
        }
        PreviewSampler sampler(grid, Frame::Icrs, "uK_CMB", 2, "low");
        for (const RingStrip& strip : cut_into_strips(grid, 100000))
            for (const MapPiece& piece : cut_into_pieces(grid, strip)) {
                const auto at = static_cast<std::size_t>(piece.first_pixel);
                const std::array<std::span<double>, 2> columns{std::span(a).subspan(at, piece.size()),
                                                               std::span(b).subspan(at, piece.size())};
                sampler.sample(piece.first_pixel, columns);
            }
        const Preview preview = sampler.take();
        EXPECT_EQ(preview.channel, "low");
        ASSERT_EQ(preview.columns.size(), 2U);
        EXPECT_EQ(preview.columns[0].grid, small);
        EXPECT_EQ(preview.columns[0].frame, Frame::Icrs);
        EXPECT_EQ(preview.columns[0].unit, "uK_CMB");
        for (std::int64_t p = 0; p < small.npix(); ++p) {
            const auto i = static_cast<std::size_t>(p);
            const auto taken = static_cast<std::int64_t>(preview.columns[0].values[i]);
            EXPECT_EQ(preview.columns[1].values[i], -static_cast<double>(taken));
            // A centre of the coarse grid lies on a corner of the finer one: any of the four pixels there
            // will do.
            EXPECT_EQ(small.pixel_at(grid.direction(taken)), p);
        }
    }
}

TEST(PreviewSampler, WhatWasNotSampledIsUndefined) {
    PreviewSampler sampler(HealpixGrid(4), Frame::Galactic, "K_RJ", 1, "x");
    std::vector<double> values(10, 1.0);
    const std::array<std::span<double>, 1> columns{values};
    sampler.sample(20, columns);
    const Preview preview = sampler.take();
    EXPECT_EQ(testing::undefined_count(preview.columns[0].values), 182);
}

}  // namespace
}  // namespace foreglow
