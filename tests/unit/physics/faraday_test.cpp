// SPDX-License-Identifier: GPL-2.0-or-later
#include "physics/faraday.h"

#include <gtest/gtest.h>

#include <cmath>

#include "base/constants.h"

namespace foreglow {
namespace {

const double at_1420 = lambda_squared(Frequency::from_ghz(1.42));
constexpr double degree = constants::pi / 180;

// Half the argument of Q + iU in IAU, in [0, 180) deg.
double angle_deg(std::complex<double> factor) {
    const double angle = 0.5 * std::arg(factor) / degree;
    return angle < 0 ? angle + 180 : angle;
}

// From outside: mpmath, closed forms against quadrature to 1e-26 (made for these tests).
TEST(Faraday, WavelengthAndDepthOfKnownCases) {
    EXPECT_NEAR(at_1420, 0.0445722663527, 1e-13);
    EXPECT_NEAR(lambda_squared(Frequency::from_ghz(22.8)), 0.000172890731521, 1e-15);
    EXPECT_NEAR(rotation_measure(0.03, 2, 1000), 48.7140698499, 1e-8);  // constants of 2018 to ten digits
}

TEST(Faraday, ScreenTurnsFromNorthThroughEastForPositiveDepth) {
    EXPECT_NEAR(angle_deg(screen_factor(10, at_1420)), 25.5380274535, 1e-9);
    const std::complex<double> turned = screen_factor(10, at_1420);  // of Q = 1, U = 0
    EXPECT_NEAR(turned.real(), 0.628288246733, 1e-11);
    EXPECT_NEAR(turned.imag(), 0.777980641801, 1e-11);  // U_IAU > 0, and in COSMO the conjugate: U < 0
    EXPECT_LT(std::conj(turned).imag(), 0);
    const auto start = std::polar(1.0, 60 * degree);  // 30 deg
    EXPECT_NEAR(angle_deg(start * screen_factor(-25, at_1420)), 146.154931366, 1e-8);
    const auto other =
        std::polar(1.0, 240 * degree) * screen_factor(-300, lambda_squared(Frequency::from_ghz(22.8)));
    EXPECT_NEAR(angle_deg(other), 117.02822723, 1e-7);
    EXPECT_NEAR(other.real(), -0.58698782954, 1e-10);
}

TEST(Faraday, BurnSlabAndItsDispersion) {
    EXPECT_NEAR(std::abs(slab_factor(20, 0, at_1420)), 0.872718290387, 1e-11);
    EXPECT_NEAR(angle_deg(slab_factor(20, 0, at_1420)), 25.5380274535, 1e-9);  // half the depth
    EXPECT_NEAR(std::abs(slab_factor(100, 0, at_1420)), 0.217090673485, 1e-11);
    EXPECT_NEAR(angle_deg(slab_factor(100, 0, at_1420)), 37.6901372673, 1e-9);
    EXPECT_NEAR(std::abs(slab_factor(50, 10, at_1420)), 0.299065035732, 1e-11);
    EXPECT_NEAR(angle_deg(slab_factor(50, 10, at_1420)), 56.9904323485, 1e-9);
}

TEST(Faraday, DispersionOfAScreen) {
    EXPECT_NEAR(screen_dispersion(5, at_1420), 0.905439926838, 1e-11);
    EXPECT_NEAR(screen_dispersion(20, lambda_squared(Frequency::from_ghz(2.3))), 0.793803007489, 1e-11);
}

TEST(Faraday, SlabIsSmoothWhereItsTwoFormsMeetAndAtNothing) {
    EXPECT_EQ(slab_factor(0, 0, at_1420), std::complex<double>(1, 0));
    for (const double sigma : {0.0, 3.0}) {
        const double edge = 0.25 / at_1420;  // |S| = 0.5 without dispersion
        for (double depth = 0.5 * edge; depth < 1.5 * edge; depth += 0.01 * edge) {
            const std::complex<double> s(2 * sigma * sigma * at_1420 * at_1420, -2 * depth * at_1420);
            const std::complex<double> direct = (1.0 - std::exp(-s)) / s;
            EXPECT_NEAR(std::abs(slab_factor(depth, sigma, at_1420) - direct), 0, 1e-14);
        }
    }
    EXPECT_NEAR(slab_factor(1e-9, 0, 1e-9).imag(), 1e-18, 1e-30);  // S/2
}

// A slab is the mean of screens of all depths between none and its own (Burn 1966).
TEST(Faraday, SlabIsTheMeanOfScreens) {
    std::complex<double> sum = 0;
    constexpr int cuts = 20000;
    for (int i = 0; i < cuts; ++i)
        sum += screen_factor(70 * (i + 0.5) / cuts, at_1420) / static_cast<double>(cuts);
    EXPECT_NEAR(std::abs(slab_factor(70, 0, at_1420) - sum), 0, 1e-7);  // midpoint rule, (6 rad/cuts)^2/24
}

TEST(Faraday, BandAverage) {
    const BandRefinement fine{0.3 / (2 * 50), 1000};
    const Response response = Response::flat(Frequency::from_ghz(1.3), Frequency::from_ghz(1.5));
    const BandSum band = make_band_sum(response, ResponseWeights::Temperature, {}, &fine);
    const auto got = band_factor(band, FaradayEmission::Behind, 50, 0);
    EXPECT_NEAR(std::abs(got), 0.928964105125, 1e-10);
    EXPECT_NEAR(0.5 * std::arg(got) / degree, -48.0028864799, 1e-8);
    EXPECT_NEAR(std::abs(band_factor(band, FaradayEmission::Behind, 0, 0) - 1.0), 0, 1e-14);
}

// Without refinement a band of a few nodes knows nothing of what turns inside it.
TEST(Faraday, RefinementAddsNodesUpToItsBound) {
    const Response response = Response::flat(Frequency::from_ghz(0.95), Frequency::from_ghz(1.05));
    const BandRefinement fine{0.3 / (2 * 1000), 500};
    const BandRefinement bounded{1e-9, 100};
    const auto plain = response.nodes(ResponseWeights::Temperature);
    const auto dense = response.nodes(ResponseWeights::Temperature, &fine);
    const double width =
        lambda_squared(Frequency::from_ghz(0.95)) - lambda_squared(Frequency::from_ghz(1.05));
    EXPECT_GE(static_cast<double>(dense.size()), width / fine.lambda2_step);
    EXPECT_LT(plain.size(), 13U);
    EXPECT_LT(response.nodes(ResponseWeights::Temperature, &bounded).size(), 115U);  // one rule's points more
    double sum = 0;
    for (const auto& node : dense)
        sum += node.weight;
    double plain_sum = 0;
    for (const auto& node : plain)
        plain_sum += node.weight;
    EXPECT_NEAR(sum / plain_sum, 1, 1e-13);
}

}  // namespace
}  // namespace foreglow
