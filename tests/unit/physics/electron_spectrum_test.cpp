// SPDX-License-Identifier: GPL-2.0-or-later
#include "physics/electron_spectrum.h"

#include <gtest/gtest.h>

#include <cmath>
#include <vector>

#include "base/constants.h"
#include "physics/synchrotron_kernel.h"

namespace foreglow {
namespace {

Frequency mhz(double value) {
    return Frequency::from_hz(value * 1e6);
}

std::vector<ElectronLaw> all_laws() {
    std::vector<ElectronLaw> laws;
    for (const FieldGeometry geometry : {FieldGeometry::Ordered, FieldGeometry::Tangled})
        for (const Aging& aging :
             {Aging(NoAging{}), Aging(ContinuousInjection{40}),
              Aging(IsotropizedAging{40, CutoffShape::Sharp}),
              Aging(IsotropizedAging{40, CutoffShape::Exponential}), Aging(FixedPitchAging{40})})
            for (int extra = 0; extra < 4; ++extra) {
                ElectronLaw law;
                law.field_uG = 4;
                law.geometry = geometry;
                law.aging = aging;
                if ((extra & 1) != 0) law.energy_break = EnergyBreak{3, 0.8};
                if ((extra & 2) != 0)
                    law.cutoff = EnergyCutoff{60, extra == 3 ? CutoffShape::Sharp : CutoffShape::Exponential};
                laws.push_back(law);
            }
    return laws;
}

// From outside: Rybicki & Lightman 1979, eq. 6.36 worked out in mpmath in SI and cgs units, which agree to
// 5e-10 (mu0 is no longer exact); k = 1.05e-5 at 1 GeV is near the local all-electron level.
TEST(ElectronSpectrum, EmitsWhatRybickiAndLightmanSay) {
    struct Row {
        double slope, density, field, hz, emissivity, kelvin_per_kpc, fraction;
    };
    for (const Row& row : {Row{3.0, 1.05e-5, 5, 408e6, 1.55590220859e-41, 9.3872988443, 0.75},
                           {2.5, 1.05e-5, 5, 408e6, 2.5265790759e-41, 15.2437297847, 0.724137931034},
                           {2.8, 2e-5, 6, 1420e6, 1.63963461379e-41, 0.81667462534, 0.74025974026}}) {
        const Frequency nu = Frequency::from_hz(row.hz);
        const double j = power_law_emissivity(row.slope, row.density, row.field, nu);
        EXPECT_NEAR(j / row.emissivity, 1, 1e-8);  // mu0, and the last digits of e, m and eps0
        ElectronLaw law;
        law.field_uG = row.field;
        EXPECT_NEAR(emissivity(law, row.slope, row.density, nu) / j, 1, 1e-11);
        const double kpc = 3.0856775814913673e19;  // m
        const double kelvin = j * kpc * constants::speed_of_light * constants::speed_of_light /
                              (2 * constants::boltzmann * row.hz * row.hz);
        EXPECT_NEAR(kelvin / row.kelvin_per_kpc, 1, 1e-8);
        EXPECT_NEAR(intrinsic_polarized_fraction(law, row.slope, nu), row.fraction, 1e-11);
        law.geometry = FieldGeometry::Tangled;
        EXPECT_NEAR(emissivity(law, row.slope, row.density, nu) / j,
                    0.5 * std::sqrt(constants::pi) * std::tgamma((row.slope + 5) / 4) /
                        std::tgamma((row.slope + 7) / 4),
                    1e-11);
        EXPECT_NEAR(intrinsic_polarized_fraction(law, row.slope, nu), row.fraction, 1e-11);
    }
}

// From outside: the table of beta(s; x0 = nu0/nu_c(E_c)) of the exponential law, mpmath, 5 decimals.
TEST(ElectronSpectrum, HasTheIndexOfTheExponentialLaw) {
    const std::vector<std::vector<double>> table{
        {1e-4, -2.04103, -2.26911, -2.51129, -2.75803, -3.00639, -3.25541, -3.50477},
        {1e-3, -2.08282, -2.29874, -2.53261, -2.77443, -3.01982, -3.26694, -3.51497},
        {1e-2, -2.16624, -2.36810, -2.58914, -2.82133, -3.05984, -3.30202, -3.54641},
        {1e-1, -2.33428, -2.52281, -2.72824, -2.94578, -3.17177, -3.40363, -3.63958},
        {1, -2.67947, -2.85803, -3.04889, -3.24990, -3.45919, -3.67513, -3.89643}};
    for (const auto& row : table) {
        ElectronLaw law;
        law.cutoff =
            EnergyCutoff{std::sqrt(mhz(408).hz() / (row[0] * critical_frequency(1, law.field_uG).hz())),
                         CutoffShape::Exponential};
        for (std::size_t i = 1; i < row.size(); ++i) {
            const double s = 1 + 0.5 * static_cast<double>(i - 1);
            EXPECT_NEAR(local_spectrum(law, s, mhz(408)).index, row[i], 6e-6);  // half of the last digit
        }
    }
}

// From outside: curvature d beta/d ln nu of that law at s = 2.5, mpmath, 4 decimals (ours is half of it).
TEST(ElectronSpectrum, HasTheCurvatureOfTheExponentialLaw) {
    for (const auto& [x0, known] : {std::pair(1e-4, -0.0039), {1e-3, -0.0116}, {1e-2, -0.0323}}) {
        ElectronLaw law;
        law.cutoff = EnergyCutoff{std::sqrt(mhz(408).hz() / (x0 * critical_frequency(1, law.field_uG).hz())),
                                  CutoffShape::Exponential};
        EXPECT_NEAR(2 * local_spectrum(law, 2.5, mhz(408)).curvature, known, 6e-5);
    }
}

// From outside: beta -> s -> T ratio of the exponential law by root finding in mpmath.
TEST(ElectronSpectrum, TurnsAnIndexIntoASlopeAndABrightness) {
    struct Row {
        double index, field, cutoff, mhz, slope, ratio;
    };
    for (const Row& row : {Row{-2.7, 4, 60, 23000, 2.3305511093, 1.4527687946e-05},
                           {-2.9, 4, 60, 1420, 2.7424905361, 0.026521595025},
                           {-2.6, 6, 20, 30000, 2.0192118127, 7.2811232182e-06}}) {
        ElectronLaw law;
        law.field_uG = row.field;
        law.cutoff = EnergyCutoff{row.cutoff, CutoffShape::Exponential};
        const auto slope = IndexOfSlope(law, mhz(408)).find(row.index);
        EXPECT_FALSE(slope.is_clamped);
        EXPECT_NEAR(slope.value, row.slope, 1e-9);
        EXPECT_NEAR(std::exp(log_electron_ratio(law, slope.value, mhz(row.mhz), mhz(408))) / row.ratio, 1,
                    1e-9);
    }
}

TEST(ElectronSpectrum, HasAnIndexThatFallsWithTheSlopeInEveryLaw) {
    for (const ElectronLaw& law : all_laws())
        for (const IndexDefinition& definition :
             {IndexDefinition(mhz(408)), IndexDefinition(std::pair(mhz(408), mhz(23000)))}) {
            const IndexOfSlope map(law, definition);
            const SlopeLimits limits = slope_limits(law);
            double before = 0;
            for (double s = limits.low; s <= limits.high; s += 0.1) {
                const double index = map.value(s);
                EXPECT_LT(index, before);
                before = index;
                const auto found = map.find(index);
                EXPECT_NEAR(map.value(found.value), index, 1e-12);
                EXPECT_FALSE(found.is_clamped);
            }
            EXPECT_TRUE(map.find(map.value(limits.low) + 0.1).is_clamped);
            EXPECT_EQ(map.find(map.value(limits.low) + 0.1).value, limits.low);
            EXPECT_EQ(map.find(-9).value, limits.high);
        }
}

// A chord of a law is the mean of its local index over ln nu; the local values are its derivatives.
TEST(ElectronSpectrum, LocalIndexAndCurvatureAreDerivatives) {
    const double h = 0.01;
    for (const ElectronLaw& law : all_laws())
        for (const double f : {60.0, 1400.0, 30000.0}) {
            const auto at = [&](int k) {
                return log_electron_ratio(law, 2.4, mhz(f * std::exp(k * h)), mhz(f));
            };
            const double first = (8 * (at(1) - at(-1)) - (at(2) - at(-2))) / (12 * h);
            const double second = (16 * (at(1) + at(-1)) - (at(2) + at(-2))) / (12 * h * h);
            const LocalSpectrum local = local_spectrum(law, 2.4, mhz(f));
            const double size = 1 + std::abs(local.index);
            EXPECT_NEAR(local.index, first, 1e-7 * size);             // h^4 of the fifth derivative
            EXPECT_NEAR(local.curvature, 0.5 * second, 1e-5 * size);  // the same, and 1e-11/h^2 of rounding
        }
}

TEST(ElectronSpectrum, AgeingThatHasHardlyBegunLeavesTheInjectedLaw) {
    for (const Aging& aging :
         {Aging(ContinuousInjection{1e-7}), Aging(IsotropizedAging{1e-7, CutoffShape::Sharp}),
          Aging(IsotropizedAging{1e-7, CutoffShape::Exponential}), Aging(FixedPitchAging{1e-7})})
        for (const FieldGeometry geometry : {FieldGeometry::Ordered, FieldGeometry::Tangled}) {
            ElectronLaw law;
            law.geometry = geometry;
            law.energy_break = EnergyBreak{5, 1};
            law.cutoff = EnergyCutoff{500, CutoffShape::Exponential};
            ElectronLaw aged = law;
            aged.aging = aging;
            for (const double f : {30.0, 1000.0, 400000.0}) {
                // What is left is of the order of E/E_T < 1e-6, E some 100 GeV at the most.
                EXPECT_NEAR(emissivity(aged, 2.3, 1, mhz(f)) / emissivity(law, 2.3, 1, mhz(f)), 1, 1e-6);
                EXPECT_NEAR(local_spectrum(aged, 2.3, mhz(f)).index, local_spectrum(law, 2.3, mhz(f)).index,
                            1e-6);
            }
        }
}

// nu and B enter as nu/B alone where nothing ages: j(nu, B)/B is a function of nu/B.
TEST(ElectronSpectrum, IsHomogeneousInFrequencyOverField) {
    for (ElectronLaw law : all_laws()) {
        law.aging = NoAging{};
        ElectronLaw strong = law;
        strong.field_uG *= 7;
        for (const double f : {30.0, 1000.0, 90000.0})
            EXPECT_NEAR(emissivity(strong, 2.6, 1, mhz(7 * f)) / (7 * emissivity(law, 2.6, 1, mhz(f))), 1,
                        1e-10);
    }
}

// Redshifted frequencies are (1 + z) nu where they are emitted; only B_IC knows z besides.
TEST(ElectronSpectrum, TakesObservedFrequencies) {
    ElectronLaw law;
    law.cutoff = EnergyCutoff{20, CutoffShape::Sharp};
    ElectronLaw far = law;
    far.redshift = 1.5;
    EXPECT_NEAR(emissivity(far, 2.2, 1, mhz(1000)), emissivity(law, 2.2, 1, mhz(2500)),
                1e-12 * emissivity(law, 2.2, 1, mhz(2500)));
}

// Far above the edge: exp(-nu/nu_c(E)) must not underflow in the logarithm, and falls as the kernel does.
TEST(ElectronSpectrum, KeepsItsLogarithmFarAboveASharpEdge) {
    ElectronLaw law;
    law.cutoff = EnergyCutoff{1, CutoffShape::Sharp};
    const double critical = critical_frequency(1, law.field_uG).hz();
    const double ratio = log_electron_ratio(law, 2.5, Frequency::from_hz(2000 * critical),
                                            Frequency::from_hz(1000 * critical));
    // Near the edge N F dE ~ exp(-x)/x^(1/2): 1000 more in the exponent, half a power, and nu^-2.
    EXPECT_NEAR(ratio, -1000 - 2.5 * std::log(2.0), 0.01);
}

// Whatever the law, between the extremes of its parts: G/F rises from 1/2 to 1 with x.
TEST(ElectronSpectrum, PolarizedFractionLiesBetweenThatOfItsKernels) {
    for (const ElectronLaw& law : all_laws()) {
        double before = 0;
        for (const double f : {10.0, 400.0, 5000.0, 100000.0}) {
            const double fraction = intrinsic_polarized_fraction(law, 2.4, mhz(f));
            EXPECT_GT(fraction, 0.5);
            EXPECT_LT(fraction, 1.0);
            const bool keeps_angles =
                std::holds_alternative<FixedPitchAging>(law.aging);  // young ones shine on
            EXPECT_GT(fraction, keeps_angles ? 0.5 : before - 1e-12);
            before = fraction;
        }
    }
}

}  // namespace
}  // namespace foreglow
