// SPDX-License-Identifier: GPL-2.0-or-later
#include "physics/band_law.h"

#include <gtest/gtest.h>

#include <cmath>
#include <limits>

namespace foreglow {
namespace {

constexpr ParameterRange wide{-3.4, -2.4, -0.15, 0.05};

BandSum band(double low_ghz, double high_ghz) {
    const Response response =
        low_ghz == high_ghz ? Response::at(Frequency::from_ghz(low_ghz))
                            : Response::flat(Frequency::from_ghz(low_ghz), Frequency::from_ghz(high_ghz));
    return make_band_sum(response, ResponseWeights::Radiance,
                         {*find_brightness_unit("uK_CMB"), Frequency::from_ghz(30), 0, 0});
}

TEST(BandLaw, AgreesWithTheExactSumBetweenItsPoints) {
    const Frequency nu0 = Frequency::from_ghz(0.408);
    for (const double high : {30.0, 33.0, 40.0, 60.0})
        for (const double tolerance : {1e-4, 1e-7, 1e-11}) {
            const BandSum sum = band(27, high);
            const BandLaw law(sum, nu0, wide, tolerance);
            EXPECT_LE(law.worst_error(), tolerance);
            for (double beta = -3.397; beta < -2.4; beta += 0.0371)
                for (double c = -0.149; c < 0.05; c += 0.0173) {
                    const double exact = exact_band_value(sum, nu0, beta, c);
                    EXPECT_NEAR(law.value(beta, c) / exact, 1,
                                1.5 * tolerance + 1e-14);  // the check grid is not this one
                }
        }
}

TEST(BandLaw, UsesTheExactSumWhereNoPolynomialWillDo) {
    const Frequency nu0 = Frequency::from_ghz(0.408);
    const BandSum sum = band(1, 1000);
    const BandLaw law(sum, nu0, wide, 1e-12);
    EXPECT_EQ(law.worst_error(), 0.0);
    for (const double beta : {-3.4, -2.7, -2.4})
        EXPECT_NEAR(law.value(beta, -0.1) / exact_band_value(sum, nu0, beta, -0.1), 1,
                    1e-14);  // two exponentials, 4e-16 each
}

TEST(BandLaw, OneFrequencyIsTheLawItself) {
    const Frequency nu0 = Frequency::from_ghz(23);
    const BandLaw law(band(70, 70), nu0, wide, 1e-12);
    const double x = std::log(70.0 / 23);
    const double per_kelvin = 1e6 / rayleigh_jeans_per_thermodynamic(Frequency::from_ghz(70));
    EXPECT_NEAR(law.value(-3.0, -0.1) / (per_kelvin * std::exp((-3.0 - 0.1 * x) * x)), 1, 1e-14);
}

TEST(BandLaw, WorksForOneIndexOrOneCurvature) {
    const Frequency nu0 = Frequency::from_ghz(1);
    const BandSum sum = band(27, 33);
    for (const ParameterRange range : {ParameterRange{-3, -3, 0, 0}, {-3, -2.5, 0, 0}, {-3, -3, -0.1, 0.1}}) {
        const BandLaw law(sum, nu0, range, 1e-10);
        EXPECT_NEAR(law.value(-3, 0) / exact_band_value(sum, nu0, -3, 0), 1, 1e-10);
    }
}

TEST(BandLaw, WorksOnManyPixelsAndKeepsUndefinedOnes) {
    const Frequency nu0 = Frequency::from_ghz(1);
    const BandLaw law(band(27, 33), nu0, wide, 1e-9);
    const std::size_t n = 1300;  // more than one block, with a rest
    std::vector<double> index(n), curvature(n, -0.02), out(n);
    for (std::size_t i = 0; i < n; ++i)
        index[i] = -3.3 + 0.0005 * static_cast<double>(i);
    index[700] = curvature[5] = std::numeric_limits<double>::quiet_NaN();
    law.evaluate(index, curvature, out);
    for (std::size_t i = 0; i < n; ++i) {
        if (i == 5 || i == 700)
            EXPECT_TRUE(std::isnan(out[i]));
        else
            EXPECT_EQ(out[i], law.value(index[i], curvature[i]));  // the place in a block must not matter
    }
}

}  // namespace
}  // namespace foreglow
