// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/regrid.h"

#include <gtest/gtest.h>

#include "base/error.h"
#include "reference.h"
#include "sphere/beam.h"
#include "sphere/fill.h"
#include "sphere/rotation.h"

namespace foreglow {
namespace {

using reference::largest_difference;

/// A smooth field of the direction, different along each axis.
double smooth(const Vector3& v) {
    return 2.0 + v[0] + 0.5 * v[1] * v[2] - 0.3 * v[2] * v[2] * v[0];
}

SkyMap smooth_map(int nside, Frame frame = Frame::Galactic) {
    SkyMap out{HealpixGrid(nside), frame, "K_RJ", {}};
    for (std::int64_t p = 0; p < out.grid.npix(); ++p)
        out.values.push_back(smooth(out.grid.direction(p)));
    return out;
}

void punch(SkyMap& map, const Vector3& center, double cos_radius) {
    for (std::int64_t p = 0; p < map.grid.npix(); ++p) {
        const auto v = map.grid.direction(p);
        if (v[0] * center[0] + v[1] * center[1] + v[2] * center[2] > cos_radius)
            map.values[static_cast<std::size_t>(p)] = undefined_pixel;
    }
}

// From outside: healpy 1.16 get_interp_val; the same four pixels and weights at the centres of pixels of a
// fine grid.
TEST(Interpolate, AgreesWithHealpy) {
    const auto table = reference::read_table("interpolation");
    const HealpixGrid grid(16);
    const auto values = reference::rough_maps(grid).i;
    for (std::size_t row = 0; row < table.at("theta").size(); ++row) {
        const double theta = table.at("theta")[row], phi = table.at("phi")[row];
        const auto stencil = grid.interpolation(
            {std::sin(theta) * std::cos(phi), std::sin(theta) * std::sin(phi), std::cos(theta)});
        double found = 0;
        for (std::size_t k = 0; k < 4; ++k)
            found += stencil.weights[k] * values[static_cast<std::size_t>(stencil.pixels[k])];
        EXPECT_NEAR(found, table.at("value")[row], 1e-12);  // rounding of phi times the grid's slope
    }
}

TEST(Interpolate, FollowsTheFrameAndStreams) {
    const SkyMap map = smooth_map(128);
    const HealpixGrid to(32);
    const SkyMap turned = interpolate(map, to, Frame::Icrs);
    EXPECT_EQ(turned.frame, Frame::Icrs);
    EXPECT_EQ(turned.unit, "K_RJ");
    const auto back = rotation_between(Frame::Icrs, Frame::Galactic);
    for (std::int64_t p = 0; p < to.npix(); ++p)
        // within a pixel (0.008 rad) of a pole the azimuths of the first ring are too far apart for a linear
        // law: an error of first order, the size of a pixel times a tenth; elsewhere second differences, 1e-4
        EXPECT_NEAR(turned.values[static_cast<std::size_t>(p)], smooth(rotate(back, to.direction(p))), 1e-3);
    std::vector<double> strip(1000);
    interpolate_pixels(map, to, Frame::Icrs, 5000, strip);
    for (std::size_t i = 0; i < strip.size(); ++i)
        EXPECT_EQ(strip[i], turned.values[5000 + i]);
    EXPECT_EQ(interpolate(map, map.grid, map.frame).values, map.values);
}

TEST(Interpolate, LeavesUndefinedNeighboursOut) {
    SkyMap map = smooth_map(16);
    map.values.assign(map.values.size(), 7.0);
    punch(map, {0, 0, 1}, 0.9);
    const SkyMap fine = interpolate(map, HealpixGrid(64), Frame::Galactic);
    std::size_t undefined = 0;
    for (const double value : fine.values) {
        if (!is_defined(value))
            ++undefined;
        else
            EXPECT_NEAR(value, 7.0, 1e-14);
    }
    // the hole is 5 % of the sky; its rim shrinks by about a coarse pixel
    EXPECT_GT(undefined, fine.values.size() / 40);
    EXPECT_LT(undefined, fine.values.size() / 20);
}

// From outside: healpy 1.16 ud_grade of a map with UNSEEN pixels (mean of the good children).
TEST(Degrade, AgreesWithHealpy) {
    const auto table = reference::read_table("degrade");
    const HealpixGrid grid(16), coarse(4);
    auto values = reference::rough_maps(grid).i;
    for (std::size_t p = 0; p < values.size(); ++p)
        if (p % 5 == 0 || p < 60) values[p] = undefined_pixel;
    const auto found = degrade(grid, values, coarse);
    ASSERT_EQ(found.size(), 192u);
    for (std::size_t p = 0; p < found.size(); ++p) {
        const double expected = table.at("value")[p];
        if (is_defined(expected))
            EXPECT_NEAR(found[p], expected, 1e-13);
        else
            EXPECT_FALSE(is_defined(found[p]));
    }
}

TEST(Degrade, WeighsByTheSizeOfTheWeights) {
    const HealpixGrid grid(2), coarse(1);
    std::vector<double> values(48, 1.0), weights(48, 1.0);
    const auto child = [&](std::int64_t k) { return static_cast<std::size_t>(grid.nested_to_ring(k)); };
    values[child(0)] = 5.0;
    weights[child(0)] = -3.0;             // brightness can be negative where noise rules
    weights[child(5)] = undefined_pixel;  // family 1: left out
    values[child(5)] = 100.0;
    for (const std::int64_t k : {8, 9, 10, 11})
        weights[child(k)] = 0.0;
    values[child(8)] = 5.0;
    const auto found = degrade(grid, values, coarse, weights);
    EXPECT_DOUBLE_EQ(found[0], (3 * 5.0 + 3) / 6);
    EXPECT_DOUBLE_EQ(found[1], 1.0);
    EXPECT_DOUBLE_EQ(found[2], 2.0);  // no weight at all: the plain mean
}

TEST(Fill, KeepsDefinedPixelsAndTheConstant) {
    SkyMap map = smooth_map(32);
    punch(map, {1, 0, 0}, 0.5);
    punch(map, {0, 0, -1}, 0.99);
    std::vector<double> filled = map.values;
    fill_undefined(map.grid, filled);
    EXPECT_EQ(count_undefined(filled), 0);
    EXPECT_GT(count_undefined(map.values), 2000);
    double lowest = 1e9, highest = -1e9;
    for (std::size_t p = 0; p < filled.size(); ++p)
        if (is_defined(map.values[p])) {
            EXPECT_EQ(filled[p], map.values[p]);
            lowest = std::min(lowest, filled[p]);
            highest = std::max(highest, filled[p]);
        }
    for (const double value : filled) {
        EXPECT_GE(value, lowest - 1e-12);
        EXPECT_LE(value, highest + 1e-12);
    }
    for (double& value : map.values)
        if (is_defined(value)) value = 3.0;
    fill_undefined(map.grid, map.values);
    for (const double value : map.values)
        EXPECT_NEAR(value, 3.0, 1e-13);
}

TEST(Fill, IsSmoothAcrossASmallHole) {
    const SkyMap whole = smooth_map(64);
    SkyMap map = whole;
    punch(map, {0.6, 0, 0.8}, std::cos(0.05));  // three pixels in radius
    fill_undefined(map.grid, map.values);
    // the field changes by 0.05 to 0.1 over the hole's radius; a fill from around stays well within that
    EXPECT_LT(largest_difference(map.values, whole.values), 0.03);
}

TEST(Fill, DoesNotDependOnThreadsAndRefusesNothing) {
    SkyMap map = smooth_map(32);
    punch(map, {1, 0, 0}, 0.8);
    std::vector<double> first;
    for (const int threads : {1, 2, 4}) {
        const reference::Threads set(threads);
        auto filled = map.values;
        fill_undefined(map.grid, filled);
        if (first.empty()) first = filled;
        EXPECT_EQ(filled, first);
    }
    std::vector<double> nothing(48, undefined_pixel);
    EXPECT_THROW(fill_undefined(HealpixGrid(2), nothing), DataError);
}

TEST(HarmonicRegrid, IsExactForABandLimitedMap) {
    const int lmax = 40;
    const Alm t = reference::closed_alm(lmax, 0.0);
    const AlmEB eb = reference::closed_alm_eb(lmax);
    const HealpixGrid from(32), to(64);
    const SkyMap map{from, Frame::Galactic, "K_RJ", synthesize(t, from)};
    auto qu = synthesize_spin2(eb, from);
    const StokesMaps maps{from, Frame::Galactic, "K_RJ", qu.q, qu.u};
    const auto found = harmonic_regrid(map, to, Frame::Ecliptic, lmax, 1e-10);
    const auto polarized = harmonic_regrid(maps, to, Frame::Ecliptic, lmax, 1e-10);
    Alm turned = t;
    AlmEB turned_eb = eb;
    rotate_alm(turned, turned_eb, Frame::Galactic, Frame::Ecliptic);
    const auto expected = synthesize_spin2(turned_eb, to);
    // 1e-10 of an rms of order 1, in the worst of 49152 pixels
    EXPECT_LT(largest_difference(found.values, synthesize(turned, to)), 2e-9);
    EXPECT_LT(largest_difference(polarized.q, expected.q), 2e-9);
    EXPECT_LT(largest_difference(polarized.u, expected.u), 2e-9);
    EXPECT_EQ(count_undefined(found.values), 0);
    EXPECT_EQ(found.frame, Frame::Ecliptic);
    EXPECT_EQ(analyse_filled(map, 1000, 1e-6).alm.lmax(), 80);  // 2.5 nside
}

TEST(HarmonicRegrid, KeepsHolesUndefinedInTheirPlace) {
    SkyMap map = smooth_map(32);
    const Vector3 center{0.6, 0, 0.8};
    punch(map, center, 0.95);
    const HealpixGrid to(64);
    const auto found = harmonic_regrid(map, to, Frame::Icrs, 64);
    EXPECT_GT(count_undefined(map.values), 250);
    const auto back = rotation_between(Frame::Icrs, Frame::Galactic);
    std::int64_t undefined = 0;
    for (std::int64_t p = 0; p < to.npix(); ++p) {
        const auto v = rotate(back, to.direction(p));
        const double cosine = v[0] * center[0] + v[2] * center[2];
        const double value = found.values[static_cast<std::size_t>(p)];
        undefined += !is_defined(value);
        const double pixel = 0.04;  // twice the radius of a pixel at nside 32, as a change of angle
        const double angle = std::acos(std::min(1.0, cosine)), rim = std::acos(0.95);
        if (angle < rim - pixel) {
            EXPECT_FALSE(is_defined(value));
        }
        if (angle > rim + pixel) {
            EXPECT_TRUE(is_defined(value));
        }
        // far from the hole its fill is not seen
        if (angle > rim + 0.5) {
            EXPECT_NEAR(value, smooth(v), 2e-3);
        }
    }
    EXPECT_EQ(undefined, count_undefined(found.values));
}

}  // namespace
}  // namespace foreglow
