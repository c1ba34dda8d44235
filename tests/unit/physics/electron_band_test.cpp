// SPDX-License-Identifier: GPL-2.0-or-later
#include "physics/electron_band.h"

#include <gtest/gtest.h>

#include <cmath>
#include <limits>

namespace foreglow {
namespace {

const Frequency nu0 = Frequency::from_ghz(0.408);

BandSum band(double low_ghz, double high_ghz) {
    const Response response =
        low_ghz == high_ghz ? Response::at(Frequency::from_ghz(low_ghz))
                            : Response::flat(Frequency::from_ghz(low_ghz), Frequency::from_ghz(high_ghz));
    return make_band_sum(response, ResponseWeights::Radiance,
                         {*find_brightness_unit("uK_CMB"), Frequency::from_ghz(30), 0, 0});
}

// Break, cut-off and each ageing together.
std::vector<ElectronLaw> full_laws(double age = 60) {
    std::vector<ElectronLaw> laws;
    for (const Aging& aging :
         {Aging(NoAging{}), Aging(ContinuousInjection{age}), Aging(IsotropizedAging{age, CutoffShape::Sharp}),
          Aging(FixedPitchAging{age})}) {
        ElectronLaw law;
        law.field_uG = 4;
        law.energy_break = EnergyBreak{6, 0.7};
        law.cutoff = EnergyCutoff{150, CutoffShape::Exponential};
        law.aging = aging;
        laws.push_back(law);
    }
    laws.back().geometry = FieldGeometry::Tangled;
    return laws;
}

Interval at(double value) {
    return {value, value};
}

TEST(ElectronBandLaw, AgreesWithTheExactSumOverTheRange) {
    for (const ElectronLaw& law : full_laws())
        for (const BandSum& sum : {band(70, 70), band(27, 33), band(30, 60), band(0.03, 0.03)})
            for (const EmissionPart part : {EmissionPart::Total, EmissionPart::Polarized}) {
                const ElectronRange range{{1.8, 3.2}, at(4), at(6), at(150)};
                const ElectronBandLaw fast(law, sum, nu0, range, part, 1e-8);
                EXPECT_LE(fast.worst_error(), 1e-8);
                const std::vector<double> slopes{1.8, 2.211, 2.87, 3.2};
                std::vector<double> out(slopes.size());
                fast.evaluate({slopes, {}, {}, {}}, out);
                for (std::size_t i = 0; i < slopes.size(); i += 3) {
                    // The tolerance, twice for what is between its checks; the exact sum's own 1e-10.
                    const double exact = exact_electron_band_value(law, slopes[i], sum, nu0, part);
                    EXPECT_NEAR(out[i] / exact, 1, 2e-8) << slopes[i];
                }
            }
}

TEST(ElectronBandLaw, FollowsMapsOfFieldBreakAndCutoff) {
    const ElectronLaw law = full_laws()[2];
    const ElectronRange range{{2, 3}, {3, 6}, {5, 8}, {100, 200}};
    const ElectronBandLaw fast(law, band(30, 30), nu0, range, EmissionPart::Total, 1e-5);
    EXPECT_LE(fast.worst_error(), 1e-5);
    const std::vector<double> slope{2.0, 2.31, 2.9, 3.0};
    const std::vector<double> field{3.0, 3.3, 5.1, 6.0};
    const std::vector<double> breaks{8, 5, 5.5, 7.7};
    const std::vector<double> cutoffs{200, 113, 171, 100};
    std::vector<double> out(4);
    fast.evaluate({slope, field, breaks, cutoffs}, out);
    for (std::size_t i = 0; i < 4; ++i) {
        const ElectronLaw own = with_pixel(law, {slope[i], field[i], breaks[i], cutoffs[i]});
        EXPECT_NEAR(out[i] / exact_electron_band_value(own, slope[i], band(30, 30), nu0, EmissionPart::Total),
                    1,
                    3e-5);  // thrice the tolerance: three variables between the checks
    }
}

TEST(ElectronBandLaw, KeepsNaNAndEndsWhereNothingIsLeft) {
    ElectronLaw law;
    law.cutoff = EnergyCutoff{2, CutoffShape::Sharp};
    const ElectronBandLaw fast(law, band(400, 400), nu0, {{2, 3}, at(5), {0, 0}, at(2)}, EmissionPart::Total,
                               1e-6);
    const std::vector<double> slopes{2.5, std::numeric_limits<double>::quiet_NaN()};
    std::vector<double> out(2);
    fast.evaluate({slopes, {}, {}, {}}, out);
    EXPECT_GE(out[0], 0);
    EXPECT_LT(out[0], 1e-200);  // x = 400 GHz/(16.08 MHz 5 4) = 1244
    EXPECT_TRUE(std::isnan(out[1]));
}

TEST(ElectronShape, FindsTheSlopesOfItsIndices) {
    for (const ElectronLaw& law : full_laws(15))
        for (const IndexDefinition& definition :
             {IndexDefinition(nu0), IndexDefinition(std::pair(nu0, Frequency::from_ghz(3)))}) {
            const ElectronShape shape(law, {{}, at(4), at(6), at(150)}, {-3.1, -2.5}, definition, nu0);
            const IndexOfSlope map(law, definition);
            std::vector<double> slopes{-3.1, -2.93, -2.7, -2.5, std::numeric_limits<double>::quiet_NaN()};
            const std::vector<double> indices = slopes;
            EXPECT_EQ(shape.find_slopes(slopes, {}), 0);
            std::vector<double> index(5), curvature(5);
            shape.write_local({slopes, {}, {}, {}}, index, curvature);
            for (std::size_t i = 0; i < 4; ++i) {
                EXPECT_NEAR(map.value(slopes[i]), indices[i],
                            3e-9);  // the box's 1e-9 and what is between its checks
                const LocalSpectrum local = local_spectrum(law, slopes[i], nu0);
                EXPECT_NEAR(index[i], local.index, 3e-9);
                EXPECT_NEAR(curvature[i], local.curvature, 1e-7);
            }
            EXPECT_TRUE(std::isnan(slopes[4]) && std::isnan(index[4]));
        }
}

TEST(ElectronShape, FindsThemUnderMapsOfTheField) {
    ElectronLaw law;
    law.cutoff = EnergyCutoff{40, CutoffShape::Exponential};
    const ElectronShape shape(law, {{}, {1, 20}, {0, 0}, at(40)}, {-3.0, -2.6}, nu0, nu0);
    const std::vector<double> field{1, 2.7, 8.8, 20};
    std::vector<double> slopes{-2.6, -3.0, -2.77, -2.6};
    const std::vector<double> indices = slopes;
    EXPECT_EQ(shape.find_slopes(slopes, {{}, field, {}, {}}), 0);
    for (std::size_t i = 0; i < 4; ++i)
        EXPECT_NEAR(IndexOfSlope(with_pixel(law, {0, field[i], 0, 40}), nu0).value(slopes[i]), indices[i],
                    1e-8);
}

TEST(ElectronShape, ClampsAndCountsWhatNoSlopeGives) {
    ElectronLaw law;
    law.cutoff = EnergyCutoff{40, CutoffShape::Exponential};
    const ElectronShape shape(law, {{}, at(5), {0, 0}, at(40)}, {-6, -1.8}, nu0, nu0);
    std::vector<double> slopes{-1.8, -2.6, -6, -2.0, -4.5};
    EXPECT_EQ(shape.find_slopes(slopes, {}), 3);
    EXPECT_EQ(slopes[0], 1);
    EXPECT_EQ(slopes[2], 7);
    EXPECT_EQ(slopes[3], 1);
    EXPECT_GT(slopes[4], 5.5);
    EXPECT_LT(slopes[4], 6.5);
}

}  // namespace
}  // namespace foreglow
