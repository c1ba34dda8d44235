// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/bilinear.h"

#include <gtest/gtest.h>

#include <cmath>

#include "reference.h"
#include "sphere/fill.h"
#include "sphere/regrid.h"

namespace foreglow {
namespace {

using Stencil = HealpixGrid::Stencil;

/// Returns the largest difference of the weights that two stencils give to any pixel.
double largest_difference(const Stencil& a, const Stencil& b) {
    const auto weight_of = [](const Stencil& s, std::int64_t pixel) {
        double sum = 0;
        for (std::size_t k = 0; k < 4; ++k)
            if (s.pixels[k] == pixel) sum += s.weights[k];
        return sum;
    };
    double worst = 0;
    for (const Stencil& one : {a, b})
        for (const std::int64_t pixel : one.pixels)
            worst = std::max(worst, std::abs(weight_of(a, pixel) - weight_of(b, pixel)));
    return worst;
}

SkyMap random_map(int nside) {
    const HealpixGrid grid(nside);
    return {grid, Frame::Galactic, "K_RJ", reference::rough_maps(grid).i};
}

/// The slow way: HEALPix's own stencil at each centre.
std::vector<double> interpolate_one_by_one(const SkyMap& map, const HealpixGrid& to, Frame frame) {
    const Matrix3 back = rotation_between(frame, map.frame);
    std::vector<double> out;
    for (std::int64_t p = 0; p < to.npix(); ++p)
        out.push_back(weighted_mean(map.values, map.grid.interpolation(rotate(back, to.direction(p)))));
    return out;
}

// Oracle: get_interpol of HEALPix 3.80. It divides an azimuth, rounded, by the width of a pixel, rounded, and
// takes off the whole number: four roundings of numbers up to 4 nside = 256, each of 256 * 2^-53. Ours are
// exact there.
constexpr double weight_tolerance = 4 * 256 * 0x1p-53;  // 1.1e-13

TEST(BilinearSampler, AgreesWithHealpixAtEveryPixelOfAnotherGrid) {
    for (int from = 1; from <= 64; from *= 2)
        for (int to = 1; to <= 64; to *= 2) {
            const HealpixGrid grid(from), to_grid(to);
            const BilinearSampler sampler(grid);
            double worst = 0;
            for (int r = 0; r < to_grid.ring_count(); ++r) {
                const auto ring = to_grid.ring(r);
                for (int c = 0; c < ring.pixels; ++c)
                    worst = std::max(worst, largest_difference(
                                                sampler.stencil_at(to_grid, r, c),
                                                grid.interpolation(to_grid.direction(ring.first_pixel + c))));
            }
            EXPECT_LE(worst, weight_tolerance) << from << " to " << to;
        }
}

TEST(BilinearSampler, AgreesWithHealpixInEveryDirection) {
    const Matrix3 back = rotation_between(Frame::Icrs, Frame::Galactic);
    for (int from = 1; from <= 64; from *= 2) {
        const HealpixGrid grid(from), to_grid(32);
        const BilinearSampler sampler(grid);
        double worst = 0;
        for (std::int64_t p = 0; p < to_grid.npix(); ++p) {
            const Vector3 v = rotate(back, to_grid.direction(p));
            worst = std::max(worst, largest_difference(sampler.stencil(v), grid.interpolation(v)));
        }
        for (const Vector3& v : {Vector3{0, 0, 1}, Vector3{0, 0, -1}, Vector3{1, 0, 0}, Vector3{-1, 0, 0},
                                 Vector3{-1, -1e-300, 0}, Vector3{0, 1, 0}, Vector3{0, -1, 0}})
            worst = std::max(worst, largest_difference(sampler.stencil(v), grid.interpolation(v)));
        EXPECT_LE(worst, weight_tolerance) << from;
    }
}

TEST(BilinearSampler, BulkAgreesWithHealpixOneByOne) {
    for (int from = 1; from <= 64; from *= 2)
        for (int to = 1; to <= 64; to *= 2)
            for (const Frame frame : {Frame::Galactic, Frame::Icrs}) {
                const SkyMap map = random_map(from);
                const HealpixGrid to_grid(to);
                if (from == to && frame == map.frame) continue;
                const auto expected = interpolate_one_by_one(map, to_grid, frame);
                const auto found = interpolate(map, to_grid, frame).values;
                double highest = 0, worst = 0;
                for (const double v : map.values)
                    highest = std::max(highest, std::abs(v));
                for (std::size_t i = 0; i < found.size(); ++i)
                    worst = std::max(worst, std::abs(found[i] - expected[i]));
                // four weights, each as above
                EXPECT_LE(worst, 4 * weight_tolerance * highest) << from << " to " << to;
            }
}

TEST(BilinearSampler, LeavesUndefinedPixelsOutAsOneByOne) {
    SkyMap map = random_map(16);
    for (std::size_t p = 0; p < map.values.size(); p += 1 + p % 7)
        map.values[p] = undefined_pixel;
    map.values[1] = map.values[2] = map.values[3] = undefined_pixel;
    for (const Frame frame : {Frame::Galactic, Frame::Icrs}) {
        const HealpixGrid to_grid(64);
        const auto expected = interpolate_one_by_one(map, to_grid, frame);
        const auto found = interpolate(map, to_grid, frame).values;
        int differing = 0;
        for (std::size_t i = 0; i < found.size(); ++i) {
            if (is_defined(found[i]) != is_defined(expected[i])) {
                ++differing;
                continue;
            }
            // Where only pixels of small weight are defined the quotient magnifies the weights' roundings.
            if (is_defined(found[i])) {
                EXPECT_NEAR(found[i], expected[i], 1e-9);
            }
        }
        // A centre on a line between pixels may get a weight of a rounding instead of none (every fourth ring
        // holds such centres); which of both is chance.
        EXPECT_LE(differing, static_cast<int>(found.size() / 50));
        EXPECT_GT(count_undefined(found), 0);
        EXPECT_LT(count_undefined(found), static_cast<std::int64_t>(found.size() / 2));
    }
}

TEST(BilinearSampler, ValuesDoNotDependOnWhereARangeBegins) {
    const SkyMap map = random_map(32);
    const HealpixGrid to_grid(64);
    for (const Frame frame : {Frame::Galactic, Frame::Ecliptic}) {
        const auto whole = interpolate(map, to_grid, frame).values;
        for (const std::int64_t first : {0, 1, 777, 20001, 49000}) {
            std::vector<double> part(133);
            interpolate_pixels(map, to_grid, frame, first, part);
            for (std::size_t i = 0; i < part.size(); ++i)
                EXPECT_EQ(part[i], whole[static_cast<std::size_t>(first) + i]);
        }
    }
}

}  // namespace
}  // namespace foreglow
