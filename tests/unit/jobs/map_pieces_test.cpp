// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/map_pieces.h"

#include <gtest/gtest.h>

#include <array>
#include <cmath>

namespace foreglow {
namespace {

// The oracle: the direction of the pixel that was taken, against the centre of the preview's pixel.
TEST(PreviewSampler, TakesAPixelAtEachCentreWhateverThePieces) {
    for (const int nside : {64, 128, 256, 1024}) {
        const HealpixGrid grid(nside);
        PreviewSampler sampler(grid, Frame::Galactic, "K_RJ", 1, "a");
        const std::int64_t piece = 12345;
        for (std::int64_t first = 0; first < grid.npix(); first += piece) {
            std::vector<double> numbers;
            for (std::int64_t p = first; p < std::min(grid.npix(), first + piece); ++p)
                numbers.push_back(static_cast<double>(p));
            const std::array<std::span<double>, 1> columns{numbers};
            sampler.sample(first, columns);
        }
        const Preview preview = sampler.take();
        const SkyMap& map = preview.columns.at(0);
        double farthest = 0;
        for (std::int64_t p = 0; p < map.grid.npix(); ++p) {
            const double taken = map.values[static_cast<std::size_t>(p)];
            ASSERT_TRUE(is_defined(taken)) << nside << ' ' << p;
            const Vector3 a = map.grid.direction(p), b = grid.direction(static_cast<std::int64_t>(taken));
            farthest = std::max(farthest, std::hypot(a[0] - b[0], a[1] - b[1], a[2] - b[2]));
        }
        // near a pole a ring is 0.82/nside away and half a pixel along it 0.64/nside: 1.04/nside
        EXPECT_LE(farthest, nside == map.grid.nside() ? 1e-14 : 1.05 / nside) << nside;
    }
}

}  // namespace
}  // namespace foreglow
