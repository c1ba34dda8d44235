// SPDX-License-Identifier: GPL-2.0-or-later
#include "physics/electron_integral.h"

#include <gtest/gtest.h>

#include <cmath>
#include <vector>

#include "base/constants.h"
#include "physics/synchrotron_kernel.h"

namespace foreglow {
namespace {

double total(const ElectronLaw& law, double slope, double hz) {
    return std::exp(ElectronIntegral(law, Frequency::from_hz(hz), EmissionPart::Total).log_value(slope));
}

// T(nu)/T(nu0), brightness temperature being j/nu^2.
double ratio(const ElectronLaw& law, double slope, double hz, double hz0) {
    return total(law, slope, hz) / total(law, slope, hz0) * (hz0 / hz) * (hz0 / hz);
}

// Int x^mu F dx = 2^(mu+1)/(mu+2) Gamma(mu/2+7/3) Gamma(mu/2+2/3) and Int x^mu G dx = 2^mu Gamma(mu/2+4/3)
// Gamma(mu/2+2/3) at mu = (s-3)/2 (Rybicki & Lightman 1979, eq. 6.35); the mean of sin^((s+1)/2) over
// directions goes with R.
double power_law(double slope, double hz, double field, bool tangled, bool polarized) {
    const double mu = 0.5 * (slope - 3);
    const double moment =
        polarized
            ? std::exp2(mu) * std::tgamma(mu / 2 + 4.0 / 3) * std::tgamma(mu / 2 + 2.0 / 3)
            : std::exp2(mu + 1) / (mu + 2) * std::tgamma(mu / 2 + 7.0 / 3) * std::tgamma(mu / 2 + 2.0 / 3);
    const double mean =
        tangled ? 0.5 * std::sqrt(constants::pi) * std::tgamma((slope + 5) / 4) / std::tgamma((slope + 7) / 4)
                : 1;
    return 0.5 * std::pow(hz / critical_frequency(1, field).hz(), -0.5 * (slope - 1)) * moment * mean;
}

TEST(ElectronIntegral, IsThePowerLawsClosedForm) {
    for (const bool tangled : {false, true}) {
        ElectronLaw law;
        law.field_uG = 5;
        law.geometry = tangled ? FieldGeometry::Tangled : FieldGeometry::Ordered;
        for (const double hz : {22e6, 408e6, 30e9, 1e12}) {
            const ElectronIntegral all(law, Frequency::from_hz(hz), EmissionPart::Total);
            const ElectronIntegral part(law, Frequency::from_hz(hz), EmissionPart::Polarized);
            const ElectronIntegral first(law, Frequency::from_hz(hz), EmissionPart::TotalFirst);
            const ElectronIntegral second(law, Frequency::from_hz(hz), EmissionPart::TotalSecond);
            for (double s = 1; s <= 7; s += 0.25) {
                // The panels' own rounding: some 300 terms of a few 1e-16.
                EXPECT_NEAR(all.value(s) / power_law(s, hz, 5, tangled, false), 1, 1e-11) << s;
                EXPECT_NEAR(part.value(s) / power_law(s, hz, 5, tangled, true), 1, 1e-11) << s;
                EXPECT_NEAR(part.value(s) / all.value(s), (s + 1) / (s + 7.0 / 3), 1e-11);
                EXPECT_NEAR(first.value(s) / all.value(s), -0.5 * (s - 1), 1e-10);
                EXPECT_NEAR(second.value(s) / all.value(s), 0.25 * (s - 1) * (s - 1), 1e-9);
            }
        }
    }
}

enum class Law { Broken, Exponential, Sharp };
struct CutRow {
    Law law;
    double slope, energy, field, mhz, ratio;
};

TEST(ElectronIntegral, BrokenAndCutLawsAgreeWithOtherIntegrators) {
    const std::vector<CutRow> rows{
        {Law::Broken, 2.0, 5.0, 4.0, 45.0, 277.921841528},
        {Law::Broken, 2.0, 5.0, 4.0, 4800.0, 0.001072392825012},
        {Law::Broken, 2.0, 5.0, 4.0, 23000.0, 9.859571494106e-06},
        {Law::Broken, 2.2, 10.0, 6.0, 22.0, 2023.165164809},
        {Law::Broken, 2.2, 10.0, 6.0, 45.0, 314.3340423581},
        {Law::Broken, 2.2, 10.0, 6.0, 4800.0, 0.001388968862832},
        {Law::Exponential, 2.5, 30.0, 4.0, 1420.0, 0.02925952605108},
        {Law::Exponential, 2.5, 30.0, 4.0, 2300.0, 0.007335659426307},
        {Law::Exponential, 2.5, 30.0, 4.0, 4800.0, 0.0008654257619844},
        {Law::Exponential, 2.8, 15.0, 5.0, 150.0, 19.61611558025},
        {Law::Exponential, 2.8, 15.0, 5.0, 1420.0, 0.02300244462777},
        {Law::Exponential, 2.8, 15.0, 5.0, 2300.0, 0.005206403792911},
        {Law::Sharp, 2.5, 20.0, 4.0, 22.0, 3110.401655758},
        {Law::Sharp, 2.5, 20.0, 4.0, 45.0, 434.3825500908},
        {Law::Sharp, 2.5, 20.0, 4.0, 4800.0, 0.0009748803270726},
        {Law::Sharp, 3.0, 40.0, 3.0, 150.0, 20.13703524418},
        {Law::Sharp, 3.0, 40.0, 3.0, 2300.0, 0.005538323692004},
        {Law::Sharp, 3.0, 40.0, 3.0, 23000.0, 4.74717222182e-06},
    };
    for (const CutRow& row : rows) {
        ElectronLaw law;
        law.field_uG = row.field;
        if (row.law == Law::Broken)
            law.energy_break = EnergyBreak{row.energy, 1};
        else
            law.cutoff = EnergyCutoff{row.energy,
                                      row.law == Law::Sharp ? CutoffShape::Sharp : CutoffShape::Exponential};
        // The last digit that the table has.
        EXPECT_NEAR(ratio(law, row.slope, row.mhz * 1e6, 408e6) / row.ratio, 1, 1e-9) << row.mhz;
    }
}

enum class Aged { IsotropizedSharp, IsotropizedExponential, Continuous, FixedPitch };
struct AgedRow {
    Aged law;
    FieldGeometry geometry;
    double microwave_ratio;  // B_IC/B; 0 stands for so strong a field that it no longer matters
    double slope, x, ratio;
};

// A(x) = aged over unaged emissivity at x times the break frequency, by two other integrators that agree to
// 2e-13 (fixed-pitch 1e-14 against nested tanh-sinh rules).
TEST(ElectronIntegral, AgedLawsAgreeWithOtherIntegrators) {
    const std::vector<AgedRow> rows{
        {Aged::IsotropizedSharp, FieldGeometry::Ordered, 1.0, 2.2, 0.01, 0.9435748210996},
        {Aged::IsotropizedSharp, FieldGeometry::Ordered, 1.0, 2.2, 0.3, 0.5647517816008},
        {Aged::IsotropizedSharp, FieldGeometry::Ordered, 1.0, 2.2, 3, 0.02644826910937},
        {Aged::IsotropizedSharp, FieldGeometry::Ordered, 1.0, 2.2, 10, 1.995093515019e-05},
        {Aged::IsotropizedSharp, FieldGeometry::Ordered, 1.0, 2.5, 0.1, 0.699482368083},
        {Aged::IsotropizedSharp, FieldGeometry::Ordered, 1.0, 2.5, 1, 0.1848797642745},
        {Aged::IsotropizedSharp, FieldGeometry::Ordered, 1.0, 3.0, 10, 5.648324370009e-06},
        {Aged::IsotropizedSharp, FieldGeometry::Tangled, 1.0, 2.2, 0.1, 0.7458947477677},
        {Aged::IsotropizedSharp, FieldGeometry::Tangled, 1.0, 2.2, 0.3, 0.5244836659862},
        {Aged::IsotropizedSharp, FieldGeometry::Tangled, 1.0, 2.2, 10, 9.514042006895e-06},
        {Aged::IsotropizedSharp, FieldGeometry::Tangled, 1.0, 2.5, 0.01, 0.9024991771841},
        {Aged::IsotropizedSharp, FieldGeometry::Tangled, 1.0, 2.5, 1, 0.154378648127},
        {Aged::IsotropizedSharp, FieldGeometry::Tangled, 1.0, 3.0, 1, 0.1104450999472},
        {Aged::IsotropizedSharp, FieldGeometry::Tangled, 1.0, 3.0, 3, 0.007764739413375},
        {Aged::IsotropizedExponential, FieldGeometry::Ordered, 1.0, 2.2, 0.3, 0.4540184352896},
        {Aged::IsotropizedExponential, FieldGeometry::Ordered, 1.0, 2.5, 0.01, 0.8593948830987},
        {Aged::IsotropizedExponential, FieldGeometry::Ordered, 1.0, 2.5, 0.1, 0.6459933728689},
        {Aged::IsotropizedExponential, FieldGeometry::Ordered, 1.0, 2.5, 0.3, 0.4916954330785},
        {Aged::IsotropizedExponential, FieldGeometry::Ordered, 1.0, 2.5, 10, 0.0480982364785},
        {Aged::IsotropizedExponential, FieldGeometry::Ordered, 1.0, 3.0, 0.01, 0.8834933179885},
        {Aged::IsotropizedExponential, FieldGeometry::Ordered, 1.0, 3.0, 10, 0.06202708768953},
        {Aged::IsotropizedExponential, FieldGeometry::Tangled, 1.0, 2.2, 0.3, 0.4301561494423},
        {Aged::IsotropizedExponential, FieldGeometry::Tangled, 1.0, 2.5, 0.01, 0.8493325665794},
        {Aged::IsotropizedExponential, FieldGeometry::Tangled, 1.0, 2.5, 1, 0.2825649192953},
        {Aged::IsotropizedExponential, FieldGeometry::Tangled, 1.0, 2.5, 3, 0.1376186860444},
        {Aged::IsotropizedExponential, FieldGeometry::Tangled, 1.0, 2.5, 10, 0.04088872558276},
        {Aged::IsotropizedExponential, FieldGeometry::Tangled, 1.0, 3.0, 3, 0.1687020449808},
        {Aged::IsotropizedExponential, FieldGeometry::Tangled, 1.0, 3.0, 10, 0.05358122373843},
        {Aged::Continuous, FieldGeometry::Ordered, 1.0, 2.2, 0.1, 0.8966283137635},
        {Aged::Continuous, FieldGeometry::Ordered, 1.0, 2.5, 0.1, 0.8532409913162},
        {Aged::Continuous, FieldGeometry::Ordered, 1.0, 2.5, 3, 0.3510244988643},
        {Aged::Continuous, FieldGeometry::Ordered, 1.0, 3.0, 0.3, 0.6757991012951},
        {Aged::Continuous, FieldGeometry::Ordered, 1.0, 3.0, 1, 0.4818938647109},
        {Aged::Continuous, FieldGeometry::Ordered, 1.0, 3.0, 3, 0.3004328734823},
        {Aged::Continuous, FieldGeometry::Ordered, 1.0, 3.0, 10, 0.1653594470248},
        {Aged::Continuous, FieldGeometry::Tangled, 1.0, 2.2, 0.1, 0.885132939749},
        {Aged::Continuous, FieldGeometry::Tangled, 1.0, 2.5, 1, 0.5232257843654},
        {Aged::Continuous, FieldGeometry::Tangled, 1.0, 2.5, 3, 0.327939559281},
        {Aged::Continuous, FieldGeometry::Tangled, 1.0, 3.0, 0.01, 0.9308013666818},
        {Aged::Continuous, FieldGeometry::Tangled, 1.0, 3.0, 0.1, 0.7888098667765},
        {Aged::Continuous, FieldGeometry::Tangled, 1.0, 3.0, 0.3, 0.655068100286},
        {Aged::Continuous, FieldGeometry::Tangled, 1.0, 3.0, 1, 0.4576646931511},
        {Aged::FixedPitch, FieldGeometry::Tangled, 0.0, 2.2, 0.1, 0.7034966822332},
        {Aged::FixedPitch, FieldGeometry::Tangled, 0.0, 2.2, 0.3, 0.4620575049454},
        {Aged::FixedPitch, FieldGeometry::Tangled, 0.0, 2.2, 10, 0.007338678535332},
        {Aged::FixedPitch, FieldGeometry::Tangled, 0.0, 2.5, 0.01, 0.8871020669492},
        {Aged::FixedPitch, FieldGeometry::Tangled, 0.0, 2.5, 0.1, 0.6262000039715},
        {Aged::FixedPitch, FieldGeometry::Tangled, 0.0, 3.0, 3, 0.01599788576662},
        {Aged::FixedPitch, FieldGeometry::Tangled, 0.0, 3.0, 10, 0.002872941296118},
        {Aged::FixedPitch, FieldGeometry::Tangled, 1.0, 2.2, 1, 0.1605814132847},
        {Aged::FixedPitch, FieldGeometry::Tangled, 1.0, 2.2, 3, 0.01051367337027},
        {Aged::FixedPitch, FieldGeometry::Tangled, 1.0, 2.5, 0.1, 0.6491264364853},
        {Aged::FixedPitch, FieldGeometry::Tangled, 1.0, 2.5, 0.3, 0.41180076995},
        {Aged::FixedPitch, FieldGeometry::Tangled, 1.0, 2.5, 1, 0.1222300474016},
        {Aged::FixedPitch, FieldGeometry::Tangled, 1.0, 2.5, 10, 2.099377056339e-06},
        {Aged::FixedPitch, FieldGeometry::Tangled, 1.0, 3.0, 0.1, 0.561903354465},
    };
    for (const AgedRow& row : rows) {
        ElectronLaw law;
        law.geometry = row.geometry;
        law.field_uG = row.microwave_ratio > 0 ? microwave_field_ug(0) / row.microwave_ratio : 3e6;
        const double age = row.microwave_ratio > 0 ? 50 : 1e-10;
        const double hz = row.x * break_frequency(law.field_uG, 0, age).hz();
        const double plain = total(law, row.slope, hz);
        switch (row.law) {
            case Aged::IsotropizedSharp:
                law.aging = IsotropizedAging{age, CutoffShape::Sharp};
                break;
            case Aged::IsotropizedExponential:
                law.aging = IsotropizedAging{age, CutoffShape::Exponential};
                break;
            case Aged::Continuous:
                law.aging = ContinuousInjection{age};
                break;
            case Aged::FixedPitch:
                law.aging = FixedPitchAging{age};
        }
        EXPECT_NEAR(total(law, row.slope, hz) / plain / row.ratio, 1, 1e-9)
            << static_cast<int>(row.law) << ' ' << row.x << ' ' << row.slope;
    }
}

}  // namespace
}  // namespace foreglow
