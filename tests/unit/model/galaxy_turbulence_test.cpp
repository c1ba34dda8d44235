// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/galaxy_turbulence.h"

#include <gtest/gtest.h>

#include <cmath>

namespace foreglow {
namespace {

double mean_square(const std::vector<double>& map) {
    double sum = 0;
    for (const double value : map)
        sum += value * value;
    return sum / static_cast<double>(map.size());
}

TEST(GalaxyTurbulence, FieldsHaveUnitVariance) {
    double brightness = 0, q = 0, u = 0;
    constexpr int skies = 12;
    for (int seed = 1; seed <= skies; ++seed) {
        GalaxySpec galaxy;
        galaxy.seed = static_cast<std::uint64_t>(seed);
        const TurbulenceFields fields = make_turbulence_fields(galaxy, HealpixGrid(64), true);
        brightness += mean_square(fields.brightness) / skies;
        q += mean_square(fields.q) / skies;
        u += mean_square(fields.u) / skies;
    }
    // The power beyond l = 128 is 0.05 of the whole; some 300 modes carry it, so that 12 skies vary by 0.03.
    EXPECT_NEAR(brightness, 0.95, 0.12);
    EXPECT_NEAR(q, 0.95, 0.12);
    EXPECT_NEAR(u, 0.95, 0.12);
}

TEST(GalaxyTurbulence, CoarserGridShowsTheSameSky) {
    const GalaxySpec galaxy;
    const TurbulenceFields fine = make_turbulence_fields(galaxy, HealpixGrid(64), false);
    const TurbulenceFields coarse = make_turbulence_fields(galaxy, HealpixGrid(32), false);
    double product = 0;
    for (std::int64_t p = 0; p < HealpixGrid(32).npix(); ++p) {
        const auto at = static_cast<std::size_t>(HealpixGrid(64).pixel_at(HealpixGrid(32).direction(p)));
        product += coarse.brightness[static_cast<std::size_t>(p)] * fine.brightness[at];
    }
    const double mean = product / static_cast<double>(HealpixGrid(32).npix());
    EXPECT_GT(mean / std::sqrt(mean_square(coarse.brightness) * mean_square(fine.brightness)), 0.9);
}

TEST(GalaxyTurbulence, KeepsTheMeanAndGrowsWithFewerCells) {
    const GalaxySpec galaxy;
    GalaxySightline line;
    line.emitting_length = 2.8;
    line.random_share = 0.84;
    const double cells = std::sqrt(2 * 0.06 / 2.8);
    const double up = std::log(turbulence_of(galaxy, line, 1, 0, 0).factor);
    const double down = std::log(turbulence_of(galaxy, line, -1, 0, 0).factor);
    EXPECT_NEAR(0.5 * (up - down), 0.8 * cells, 1e-14);
    EXPECT_NEAR(up + down, -std::pow(0.8 * cells, 2), 1e-14);
    EXPECT_NEAR(turbulence_of(galaxy, line, 0, 1, -2).u, -2 * 0.45 * 0.84 * cells, 1e-14);
    line.emitting_length = 0.01;
    EXPECT_NEAR(std::log(turbulence_of(galaxy, line, 1, 0, 0).factor), 0.6 - 0.18, 1e-14);  // the cap
}

}  // namespace
}  // namespace foreglow
