// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/quadrature_leak.h"

#include <gtest/gtest.h>

#include <cmath>
#include <functional>
#include <numeric>

#include "base/constants.h"
#include "base/error.h"
#include "sphere/beam.h"
#include "sphere/converged_analysis.h"
#include "sphere/gaussian_field.h"
#include "sphere/harmonics.h"
#include "sphere/power_spectrum.h"
#include "sphere/ring_weights.h"

namespace foreglow {
namespace {

std::vector<double> red_spectrum(int lmax, double slope) {
    std::vector<double> cl(static_cast<std::size_t>(lmax) + 1, 0.0);
    for (std::size_t l = 2; l < cl.size(); ++l)
        cl[l] = std::pow(static_cast<double>(l) + 10, slope);
    return cl;
}

std::vector<double> gaussian_map(const HealpixGrid& grid, int lmax, double slope, std::uint64_t field) {
    RandomKey key;
    key.seed = 5;
    key.field = static_cast<std::uint32_t>(field);
    auto map = synthesize(make_gaussian_alm(red_spectrum(lmax, slope), lmax, key), grid);
    const double scale = 1 / rms_of_spectrum(red_spectrum(lmax, slope));
    for (double& value : map)
        value *= scale;
    return map;
}

struct Sky {
    const char* name;
    std::function<std::vector<double>(const HealpixGrid&)> make;
};

std::vector<double> shaped(std::vector<double> map, const HealpixGrid& grid,
                           const std::function<double(const Vector3&, double)>& shape) {
    for (std::int64_t p = 0; p < grid.npix(); ++p)
        map[static_cast<std::size_t>(p)] = shape(grid.direction(p), map[static_cast<std::size_t>(p)]);
    return map;
}

double plane(const Vector3& n, double g) {
    return (10 + 20 * std::exp(-std::abs(std::asin(n[2])) / 0.17)) * std::exp(0.3 * g);
}

std::vector<Sky> skies() {
    return {{"red", [](const HealpixGrid& g) { return gaussian_map(g, 2 * g.nside(), -2.6, 1); }},
            {"white", [](const HealpixGrid& g) { return gaussian_map(g, 2 * g.nside(), 0, 2); }},
            {"white beyond lmax", [](const HealpixGrid& g) { return gaussian_map(g, 4 * g.nside(), 0, 3); }},
            {"bright plane",
             [](const HealpixGrid& g) { return shaped(gaussian_map(g, 2 * g.nside(), -2.6, 4), g, plane); }},
            {"narrow plane",
             [](const HealpixGrid& g) {
                 return shaped(gaussian_map(g, 2 * g.nside(), -2.6, 4), g,
                               [](const Vector3& n, double) { return 8 / (std::abs(n[2]) + 0.1); });
             }},
            {"smooth",
             [](const HealpixGrid& g) {
                 return shaped(gaussian_map(g, 8, -2.6, 4), g,
                               [](const Vector3& n, double) { return std::exp(n[0] + 0.5 * n[2]); });
             }},
            {"step", [](const HealpixGrid& g) {
                 return shaped(gaussian_map(g, 8, -2.6, 4), g,
                               [](const Vector3& n, double) { return n[2] + n[0] > 0.3 ? 2.0 : 1.0; });
             }}};
}

double total_power(std::span<const double> map) {
    double square = 0;
    for (const double v : map)
        square += v * v;
    return square * 4 * constants::pi / static_cast<double>(map.size());
}

void remove_mean(std::vector<double>& map) {
    const double mean = std::accumulate(map.begin(), map.end(), 0.0) / static_cast<double>(map.size());
    for (double& v : map)
        v -= mean;
}

// "What remains" is measured against 15 unweighted refinements.
TEST(QuadratureLeak, BoundsWhatOneWeightedAnalysisLeavesOfManySkies) {
    const int nside = 64, lmax = 2 * nside;
    const HealpixGrid grid(nside);
    const RingWeights weights = make_ring_weights(nside, 3 * nside - 1);
    for (const Sky& sky : skies()) {
        SCOPED_TRACE(sky.name);
        auto map = sky.make(grid);
        remove_mean(map);
        Alm alm = analyse(grid, map, lmax, &weights);
        const auto cl = power_spectrum(alm);
        double above = total_power(map);
        for (std::size_t l = 0; l < cl.size(); ++l)
            above -= (2 * static_cast<double>(l) + 1) * cl[l];
        add_scaled(alm, -1, analyse_converged(grid, map, lmax, {1e-13, 15, nullptr, {}}).alm);
        const auto error = power_spectrum(alm);
        const auto leak = predict_leak(cl, std::max(0.0, above), nside, 0);
        for (const double pixels : {13.0, 5.0, 2.5, 0.0}) {
            SCOPED_TRACE(pixels);
            const BeamWindow beam = make_gaussian_beam(Angle::from_degrees(58.6 / nside * pixels), lmax);
            const double found = rms_of_spectrum(error, beam.temperature);
            const double predicted = rms_of_spectrum(leak, beam.temperature);
            EXPECT_LE(found, leak_allowance * predicted);
            EXPECT_GE(found, predicted / 100);  // else the prediction would save nothing; worst seen: 1/64
        }
    }
}

TEST(QuadratureLeak, IsLinearInPower) {
    std::vector<double> cl = red_spectrum(64, -2);
    const auto once = predict_leak(cl, 0.5, 32, 2);
    for (double& c : cl)
        c *= 4;
    const auto four = predict_leak(cl, 2.0, 32, 2);
    for (std::size_t l = 0; l < once.size(); ++l)
        EXPECT_NEAR(four[l], 4 * once[l], 1e-12 * four[l]);
    EXPECT_EQ(once[0], 0.0);
    EXPECT_GT(once[2], 0.0);
}

TEST(QuadratureLeak, RefusesWhatWasNotMeasured) {
    EXPECT_THROW((void)predict_leak(std::vector<double>(66, 1.0), 0, 32, 0), ContractError);
    EXPECT_THROW((void)predict_leak(std::vector<double>(65, 1.0), 0, 32, 1), ContractError);
    EXPECT_THROW((void)predict_leak(std::vector<double>(65, 1.0), -1, 32, 0), ContractError);
}

}  // namespace
}  // namespace foreglow
