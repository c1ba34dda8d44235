// SPDX-License-Identifier: GPL-2.0-or-later
#include "physics/electron_law.h"

#include <gtest/gtest.h>

#include <cmath>

namespace foreglow {
namespace {

// c2 = 2.36773026e-3 in cgs, 0.119714453 and (2/3) of it 0.0798096353 GeV^-1 Gyr^-1 uG^-2 (Pacholczyk 1970,
// with CODATA 2018 put in by hand).
TEST(ElectronLaw, LosesAtThePublishedRates) {
    const double microwave = microwave_field_ug(0);
    EXPECT_EQ(microwave, 3.25);
    EXPECT_EQ(microwave_field_ug(1), 13.0);
    EXPECT_NEAR(isotropized_loss_rate(3, 0) * 1e3, 0.0798096353 * (9 + 3.25 * 3.25), 2e-8);  // its last digit
    EXPECT_NEAR(fixed_pitch_loss_rate(3, 0.5, 0) * 1e3, 0.119714453 * (2.25 + 2.0 / 3 * 3.25 * 3.25), 2e-8);
    ElectronLaw law;
    law.field_uG = 2;
    EXPECT_EQ(loss_rate(law), isotropized_loss_rate(2, 0));
    law.aging = FixedPitchAging{10};
    EXPECT_EQ(loss_rate(law), fixed_pitch_loss_rate(2, 1, 0));
}

// From outside: nu_b = 7.916161701 GHz for 3 uG, z = 0, 50 Myr; 4.851359297 GHz for z = 0.5, 20 Myr, worked
// out in mpmath; and t = 1590 sqrt(B)/((B^2 + B_IC^2) sqrt(nu_b)) (common practice; the constant is rounded
// to three digits).
TEST(ElectronLaw, BreaksWhereItShould) {
    EXPECT_NEAR(break_frequency(3, 0, 50).ghz(), 7.916161701, 1e-8);
    EXPECT_NEAR(break_frequency(3, 0.5, 20).ghz(), 4.851359297, 1e-8);
    EXPECT_NEAR(1 / (isotropized_loss_rate(3, 0) * 50), 12.81003494, 1e-7);
    for (const double field : {1.0, 5.0, 20.0})
        for (const double ghz : {0.1, 2.0, 30.0}) {
            const double age = break_age(field, 0.2, Frequency::from_ghz(ghz));
            const double microwave = microwave_field_ug(0.2);
            const double known =
                1590 * std::sqrt(field) / ((field * field + microwave * microwave) * std::sqrt(ghz));
            EXPECT_NEAR(age / known, 1, 1e-3);
            EXPECT_NEAR(break_frequency(field, 0.2, age).ghz(), ghz, 1e-12 * ghz);
        }
}

TEST(ElectronLaw, NeedsSteepEnoughElectronsWhereAnAgedSpectrumHasNoEnd) {
    ElectronLaw law;
    EXPECT_EQ(slope_limits(law).low, 1.0);
    law.aging = ContinuousInjection{10};
    EXPECT_GT(slope_limits(law).low, 1.0);
    law.cutoff = EnergyCutoff{100, CutoffShape::Sharp};
    EXPECT_EQ(slope_limits(law).low, 1.0);
    law.cutoff.reset();
    law.aging = IsotropizedAging{10, CutoffShape::Exponential};
    EXPECT_EQ(slope_limits(law).low, 1.0);
    EXPECT_EQ(slope_limits(law).high, 7.0);
}

}  // namespace
}  // namespace foreglow
