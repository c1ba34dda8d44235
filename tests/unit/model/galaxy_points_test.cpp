// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/galaxy_points.h"

#include <gtest/gtest.h>

#include <cmath>

#include "model/galaxy_maps.h"
#include "model/galaxy_turbulence.h"

namespace foreglow {
namespace {

const std::vector<std::int64_t> pixels{5, 1500, 1537, 3071, 1500};

std::vector<PointRow> make_rows() {
    std::vector<PointRow> rows;
    for (const double hz : {70e6, 1.4e9, 30e9})
        rows.push_back({{{hz}, {1.0}}, Frequency::from_hz(hz), {}});
    rows.push_back({{{20e9, 25e9}, {0.25, 0.75}}, Frequency::from_ghz(23), {}});
    return rows;
}

TEST(GalaxyPoints, AreThePixelsThatTheMakerOfMapsMakes) {
    GalaxySpec galaxy;
    galaxy.index_scatter = 0.1;  // so that all fields are drawn
    const HealpixGrid grid(16);
    const auto rows = make_rows();
    const GalaxyPoints points(galaxy, Frequency::from_hz(408e6), grid, true);
    const std::vector<PointValues> got = points.answer(pixels, rows);
    const GalaxyMaker maker(galaxy, std::make_shared<const GalaxyTable>(galaxy), grid, true);
    const std::vector<Frequency> frequencies{Frequency::from_hz(70e6), Frequency::from_hz(1.4e9),
                                             Frequency::from_hz(30e9), Frequency::from_hz(20e9),
                                             Frequency::from_hz(25e9)};
    const GalaxyMaps maps = maker.make_pixels(pixels, frequencies, true);
    for (std::size_t i = 0; i < pixels.size(); ++i) {
        // A ring of a field by itself differs from the whole by rounding, 1e-14 of its unit size; q and u are
        // below i.
        const double tolerance = 1e-12;
        for (std::size_t k = 0; k < 3; ++k) {
            EXPECT_NEAR(got[k].brightness[i] / maps.i[k][i], 1, tolerance);
            EXPECT_NEAR(got[k].q[i] / maps.i[k][i], maps.q[k][i] / maps.i[k][i], tolerance);
            EXPECT_NEAR(got[k].u[i] / maps.i[k][i], maps.u[k][i] / maps.i[k][i], tolerance);
        }
        const double band = 0.25 * maps.i[3][i] + 0.75 * maps.i[4][i];
        EXPECT_NEAR(got[3].brightness[i] / band, 1, tolerance);
    }
    EXPECT_EQ(got[0].brightness[1], got[0].brightness[4]);
}

TEST(GalaxyPoints, HaveTheSlopeOfTheirBrightness) {
    const HealpixGrid grid(16);
    const GalaxyPoints points(GalaxySpec{}, Frequency::from_hz(408e6), grid, false);
    std::vector<PointRow> rows;
    for (const double hz : {0.99e9, 1e9, 1.01e9})
        rows.push_back({{{hz}, {1.0}}, Frequency::from_hz(hz), {}});
    const std::vector<PointValues> got = points.answer(pixels, rows);
    EXPECT_TRUE(got[0].q.empty());
    for (std::size_t i = 0; i < pixels.size(); ++i) {
        const double slope = std::log(got[2].brightness[i] / got[0].brightness[i]) / std::log(1.01 / 0.99);
        // The stencil's 0.3^4/30 of a fifth derivative below 0.1, and the chord's 1e-4/6 of a third one.
        EXPECT_NEAR(got[1].index[i], slope, 5e-5);
        EXPECT_NEAR(got[1].curvature[i], 0.5 * (got[2].index[i] - got[0].index[i]) / std::log(1.01 / 0.99),
                    1e-3);  // the difference of two stencils over 0.02
        EXPECT_EQ(got[0].index_reference[i], got[2].index_reference[i]);
    }
}

TEST(TurbulenceWaves, GiveSinglePixelsAsTheyAreInTheWholeSky) {
    GalaxySpec galaxy;
    galaxy.index_scatter = 0.1;
    const HealpixGrid grid(16);
    const TurbulenceWaves waves(galaxy, grid, true);
    const TurbulenceFields whole = waves.everywhere();
    const TurbulenceFields some = waves.at(pixels);
    for (std::size_t i = 0; i < pixels.size(); ++i) {
        const auto p = static_cast<std::size_t>(pixels[i]);
        // Fields of unit size, sums of 500 terms of either sign.
        EXPECT_NEAR(some.brightness[i], whole.brightness[p], 1e-13);
        EXPECT_NEAR(some.index[i], whole.index[p], 1e-13);
        EXPECT_NEAR(some.q[i], whole.q[p], 1e-13);
        EXPECT_NEAR(some.u[i], whole.u[p], 1e-13);
    }
}

}  // namespace
}  // namespace foreglow
