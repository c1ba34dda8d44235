// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/grid.h"

#include <gtest/gtest.h>

#include <set>

#include "base/constants.h"
#include "base/error.h"
#include "reference.h"

namespace foreglow {
namespace {

// From outside: healpy 1.16 (pix2vec, ring2nest, get_interp_weights, get_all_neighbours),
// sphere_reference.py.
TEST(HealpixGrid, AgreesWithHealpy) {
    const auto table = reference::read_table("grid");
    const auto cell = [&](char name, std::size_t k) { return table.at({name, static_cast<char>('0' + k)}); };
    for (std::size_t row = 0; row < table.at("nside").size(); ++row) {
        const HealpixGrid grid(static_cast<int>(table.at("nside")[row]));
        const auto pixel = static_cast<std::int64_t>(table.at("pixel")[row]);
        const auto v = grid.direction(pixel);
        // healpy's z has no more digits than this near a pole
        EXPECT_NEAR(v[0], table.at("x")[row], 1e-14);
        EXPECT_NEAR(v[1], table.at("y")[row], 1e-14);
        EXPECT_NEAR(v[2], table.at("z")[row], 1e-14);
        EXPECT_EQ(grid.pixel_at(v), pixel);
        const auto nested = static_cast<std::int64_t>(table.at("nested")[row]);
        EXPECT_EQ(grid.ring_to_nested(pixel), nested);
        EXPECT_EQ(grid.nested_to_ring(nested), pixel);
        std::multiset<std::int64_t> neighbours, expected;
        for (std::size_t k = 0; k < 8; ++k)
            expected.insert(static_cast<std::int64_t>(cell('n', k)[row]));
        for (const auto n : grid.neighbours(pixel))
            neighbours.insert(n);
        EXPECT_EQ(neighbours, expected);
        const double theta = table.at("theta")[row], phi = table.at("phi")[row];
        const auto stencil = grid.interpolation(
            {std::sin(theta) * std::cos(phi), std::sin(theta) * std::sin(phi), std::cos(theta)});
        for (std::size_t k = 0; k < 4; ++k) {
            EXPECT_EQ(static_cast<double>(stencil.pixels[k]), cell('p', k)[row]);
            // phi / pixel width at nside 8192 has 3e4 times the rounding of phi
            EXPECT_NEAR(stencil.weights[k], cell('w', k)[row], 1e-10);
        }
    }
}

TEST(HealpixGrid, RingsTileTheSphereAndAgreeWithTheirPixels) {
    for (const int nside : {1, 2, 4, 32}) {
        const HealpixGrid grid(nside);
        std::int64_t next = 0;
        for (int r = 0; r < grid.ring_count(); ++r) {
            const auto ring = grid.ring(r);
            EXPECT_EQ(ring.first_pixel, next);
            next += ring.pixels;
            for (const auto p : {ring.first_pixel, ring.first_pixel + ring.pixels - 1}) {
                EXPECT_EQ(grid.ring_of(p), r);
                EXPECT_NEAR(grid.direction(p)[2], ring.cos_theta, 1e-15);
                EXPECT_EQ(grid.pixel_at(grid.direction(p)), p);
            }
            EXPECT_NEAR(ring.cos_theta * ring.cos_theta + ring.sin_theta * ring.sin_theta, 1.0, 4e-16);
        }
        EXPECT_EQ(next, grid.npix());
    }
}

TEST(HealpixGrid, KeepsItsDigitsAtThePolesOfTheFinestGrid) {
    const HealpixGrid grid(8192);
    // theta of ring i: sin(theta / 2) = i / (sqrt(6) nside), exactly
    const double theta = 2.0 * std::asin(1.0 / (std::sqrt(6.0) * 8192));
    EXPECT_NEAR(grid.ring(0).sin_theta / std::sin(theta), 1.0, 4e-16);
    EXPECT_NEAR(grid.ring(grid.ring_count() - 1).sin_theta / std::sin(theta), 1.0, 4e-16);
}

TEST(HealpixGrid, BulkNumbersAreThoseOfSinglePixels) {
    const HealpixGrid grid(16);
    std::vector<std::int64_t> nested(100), ring(100);
    std::vector<Vector3> directions(100);
    grid.nested_numbers(1000, nested);
    grid.ring_numbers(1000, ring);
    grid.directions(1000, directions);
    for (std::int64_t i = 0; i < 100; ++i) {
        EXPECT_EQ(nested[static_cast<std::size_t>(i)], grid.ring_to_nested(1000 + i));
        EXPECT_EQ(ring[static_cast<std::size_t>(i)], grid.nested_to_ring(1000 + i));
        EXPECT_EQ(directions[static_cast<std::size_t>(i)], grid.direction(1000 + i));
    }
}

TEST(HealpixGrid, RefusesWhatIsNoGridOrPixel) {
    for (const int nside : {0, -1, 3, 48, 16384}) {
        EXPECT_FALSE(is_valid_nside(nside));
        EXPECT_THROW(HealpixGrid{nside}, ContractError);
    }
    EXPECT_THROW((void)HealpixGrid(4).direction(192), ContractError);
    EXPECT_THROW((void)HealpixGrid(4).ring_to_nested(-1), ContractError);
    EXPECT_THROW((void)HealpixGrid(4).ring(15), ContractError);
}

// Oracle: vec2pix of HEALPix C++, place by place.
TEST(HealpixGrid, FindsThePixelsOfAParallelAsPixelAtDoes) {
    for (const int nside : {1, 2, 16, 512}) {
        const HealpixGrid grid(nside);
        std::vector<double> turns;
        for (int k = 0; k < 1000; ++k)
            turns.push_back((k + 0.371) / 1000);
        std::vector<std::int32_t> found(turns.size());
        for (int j = 0; j < 301; ++j) {
            const double z = 1.0 - (j + 0.123) / 150.3;
            const double s = std::sqrt((1 - z) * (1 + z));
            grid.pixels_on_parallel(z, s, turns, found);
            for (std::size_t k = 0; k < turns.size(); ++k) {
                const double phi = 2 * constants::pi * turns[k];
                ASSERT_EQ(found[k], grid.pixel_at({s * std::cos(phi), s * std::sin(phi), z}))
                    << nside << ' ' << z;
            }
        }
        const std::vector<double> ends{0.0, 1.0};
        std::vector<std::int32_t> same(2);
        for (const double z : {0.9, 0.01, -0.9}) {
            grid.pixels_on_parallel(z, std::sqrt(1 - z * z), ends, same);
            EXPECT_EQ(same[0], same[1]);
        }
    }
}

}  // namespace
}  // namespace foreglow
