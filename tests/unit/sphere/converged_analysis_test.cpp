// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/converged_analysis.h"

#include <gtest/gtest.h>

#include "reference.h"
#include "sphere/power_spectrum.h"

namespace foreglow {
namespace {

using reference::closed_alm;
using reference::closed_alm_eb;
using reference::largest_difference;

// From outside: healpy 1.16 map2alm with iter=30 on maps that are not band-limited: the unweighted
// least-squares solution.
TEST(ConvergedAnalysis, GoesWhereHealpyGoesWithManyIterations) {
    const auto table = reference::read_table("analysis");
    const HealpixGrid grid(16);
    const auto maps = reference::rough_maps(grid);
    const RingWeights weights = make_ring_weights(16, 32);
    ConvergenceOptions options;
    options.tolerance = 1e-13;
    options.max_iterations = 40;
    for (const bool weighted : {false, true}) {
        options.start_weights = weighted ? &weights : nullptr;
        const auto t = analyse_converged(grid, maps.i, 32, options);
        const auto eb = analyse_converged_spin2(grid, maps.q, maps.u, 32, options);
        EXPECT_TRUE(t.report.reached && eb.report.reached);
        for (std::size_t row = 0; row < table.at("l").size(); ++row) {
            const int l = static_cast<int>(table.at("l")[row]), m = static_cast<int>(table.at("m")[row]);
            const auto expected = [&](const std::string& name) {
                return Alm::Value(table.at(name + "_re")[row], table.at(name + "_im")[row]);
            };
            EXPECT_LT(std::abs(t.alm(l, m) - expected("t")), 1e-12);  // 1e-13 of an rms of 3, and rounding
            EXPECT_LT(std::abs(eb.alm.e(l, m) - expected("e")), 1e-12);
            EXPECT_LT(std::abs(eb.alm.b(l, m) - expected("b")), 1e-12);
        }
    }
}

TEST(ConvergedAnalysis, RecoversBandLimitedCoefficientsAndSaysHowWell) {
    const HealpixGrid grid(32);
    const Alm a = closed_alm(64, 0.0);
    const AlmEB eb = closed_alm_eb(64);
    const auto map = synthesize(a, grid);
    const auto qu = synthesize_spin2(eb, grid);
    for (const double tolerance : {1e-4, 1e-7, 1e-10}) {
        ConvergenceOptions options;
        options.tolerance = tolerance;
        auto found = analyse_converged(grid, map, 64, options);
        add_scaled(found.alm, -1.0, a);
        const double error = rms_of_spectrum(power_spectrum(found.alm)) / rms_of_spectrum(power_spectrum(a));
        EXPECT_TRUE(found.report.reached);
        EXPECT_LE(error, tolerance);
        EXPECT_LE(error, found.report.relative_error);
        auto polarized = analyse_converged_spin2(grid, qu.q, qu.u, 64, options);
        add_scaled(polarized.alm.e, -1.0, eb.e);
        add_scaled(polarized.alm.b, -1.0, eb.b);
        const double size =
            std::hypot(rms_of_spectrum(power_spectrum(eb.e)), rms_of_spectrum(power_spectrum(eb.b)));
        const double error2 = std::hypot(rms_of_spectrum(power_spectrum(polarized.alm.e)),
                                         rms_of_spectrum(power_spectrum(polarized.alm.b))) /
                              size;
        EXPECT_LE(error2, tolerance);
        EXPECT_LE(error2, polarized.report.relative_error);
    }
}

TEST(ConvergedAnalysis, DoesAFixedNumberOfIterationsWhenAsked) {
    const HealpixGrid grid(8);
    const auto maps = reference::rough_maps(grid);
    ConvergenceOptions options;
    options.tolerance = 0;
    options.max_iterations = 3;
    const auto found = analyse_converged(grid, maps.i, 16, options);
    EXPECT_EQ(found.report.iterations, 3);
    EXPECT_FALSE(found.report.reached);
    EXPECT_EQ(found.report.correction_cl.size(), 17u);
    Alm by_hand = analyse(grid, maps.i, 16);
    for (int k = 0; k < 3; ++k) {
        auto residual = synthesize(by_hand, grid);
        for (std::size_t p = 0; p < residual.size(); ++p)
            residual[p] = maps.i[p] - residual[p];
        add_scaled(by_hand, 1.0, analyse(grid, residual, 16));
    }
    EXPECT_LT(largest_difference(found.alm.values(), by_hand.values()), 1e-13);
    options.max_iterations = 0;
    EXPECT_EQ(analyse_converged(grid, maps.i, 16, options).alm, analyse(grid, maps.i, 16));
}

TEST(ConvergedAnalysis, AMapOfZerosIsItsOwnAnswer) {
    const HealpixGrid grid(4);
    const std::vector<double> zero(192);
    const auto found = analyse_converged(grid, zero, 8);
    EXPECT_TRUE(found.report.reached);
    EXPECT_EQ(found.alm, Alm(8));
}

// From outside: a weighted sum is exact for zonal harmonics up to the weights' lmax (Gorski et al. 2005,
// section 5).
TEST(RingWeights, IntegrateZonalHarmonicsExactly) {
    const int nside = 16, lmax = 40;
    const auto weights = make_ring_weights(nside, lmax, 1e-12);
    const HealpixGrid grid(nside);
    ASSERT_EQ(weights.values.size(), 32u);
    double uniform_worst = 0;
    for (unsigned l = 0; l <= lmax; l += 2) {
        double weighted = 0, uniform = 0;
        for (int r = 0; r < grid.ring_count(); ++r) {
            const auto ring = grid.ring(r);
            const double term =
                std::legendre(l, ring.cos_theta) * ring.pixels / static_cast<double>(grid.npix());
            uniform += term;
            weighted +=
                term * weights.values[static_cast<std::size_t>(std::min(r, grid.ring_count() - 1 - r))];
        }
        EXPECT_NEAR(weighted, l == 0 ? 1.0 : 0.0, 1e-12);  // the solver's residual
        uniform_worst = std::max(uniform_worst, std::abs(uniform - (l == 0 ? 1.0 : 0.0)));
    }
    EXPECT_GT(uniform_worst, 1e-6);  // without them it is not so
}

}  // namespace
}  // namespace foreglow
