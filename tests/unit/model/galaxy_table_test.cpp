// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/galaxy_table.h"

#include <gtest/gtest.h>

#include <cmath>

#include "math/gauss_legendre.h"
#include "physics/synchrotron_kernel.h"

namespace foreglow {
namespace {

// Phi by Gauss-Legendre in ln E, pieces of one e-fold, from the formulas of docs/physics.md.
double direct_phi(double a, double height, bool young) {
    const QuadratureRule rule = make_gauss_legendre(24);
    const auto shape = [](double e) {
        return std::pow(e / 10, -1.8) * std::pow(1 + std::pow(e / 3.5, 2), -(3.42 - 1.8) * 0.5);
    };
    const auto density = [&](double e) {
        if (young)
            return 0.55 * 1.15e-8 * std::pow(e / 10, -2.6) * std::exp(-(e - 10) / 200) *
                   std::pow(1 + 2.5 / e, -0.6);
        return 1.15e-8 * shape(e) / shape(10) * std::exp(-height / (2.6 * std::pow(1 + e / 3, -0.4)));
    };
    double sum = 0;
    const double first = 0.5 * std::log(a / 700);
    for (int piece = 0; piece < 20; ++piece)
        for (std::size_t i = 0; i < rule.nodes.size(); ++i) {
            const double e = std::exp(first + piece + 0.5 + 0.5 * rule.nodes[i]);
            sum += 0.5 * rule.weights[i] * e * density(e) * kernel_f(a / (e * e));
        }
    return sum;
}

TEST(GalaxyTable, AgreesWithDirectIntegralsOverEnergy) {
    const GalaxyTable table{GalaxySpec()};
    for (double log_a = -9; log_a < 18; log_a += 0.711) {
        for (const double z : {0.0, 0.013, 0.4, 2.2, 7.0, 12.0})
            EXPECT_NEAR(table.log_old(log_a, z), std::log(direct_phi(std::exp(log_a), z, false)), 1e-7)
                << log_a << " " << z;  // what the header promises
        EXPECT_NEAR(table.log_young(log_a), std::log(direct_phi(std::exp(log_a), 0, true)), 1e-7) << log_a;
    }
}

TEST(GalaxyTable, SlopeIsTheDerivative) {
    const GalaxyTable table{GalaxySpec()};
    for (double log_a = -6; log_a < 15; log_a += 1.37) {
        const double h = 1e-3;
        const double numeric = (table.log_old(log_a + h, 1.0) - table.log_old(log_a - h, 1.0)) / (2 * h);
        EXPECT_NEAR(table.slope_old(log_a, 1.0), numeric, 1e-6);  // of the difference: h^2/6 and table errors
    }
}

// At high a the electrons above the break are a power law of s = 3.42: Phi ~ a^-(s - 1)/2 (Rybicki & Lightman
// 6.22a) in the plane, where the scale height does not matter.
TEST(GalaxyTable, TendsToThePowerLawOfTheElectronsAboveTheBreak) {
    const GalaxyTable table{GalaxySpec()};
    EXPECT_NEAR(table.slope_old(16.0, 0.0), -(3.42 - 1) / 2,
                2e-4);  // (Eb/E)^2 at E^2 = a is 1e-6, s flattens by it
}

TEST(GalaxyTable, PopulationsCanBeSwitchedOff) {
    GalaxySpec galaxy;
    galaxy.young_share = 0;
    const GalaxyTable table(galaxy);
    EXPECT_LT(table.log_young(5.0), -590);  // nothing, in a form that a spline can hold
    EXPECT_GT(table.log_old(5.0, 0.0), -100);
}

}  // namespace
}  // namespace foreglow
