// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/detail_spectrum.h"

#include <gtest/gtest.h>

#include <cmath>
#include <fstream>

#include "base/constants.h"
#include "base/error.h"
#include "sphere/beam.h"

namespace foreglow {
namespace {

DetailSpec given() {
    DetailSpec spec;
    spec.intensity = PowerLawSpec{-2.7, {0.01, {BrightnessUnit::Kind::RayleighJeans, 1.0}}, 80};
    spec.polarization = PowerLawSpec{-2.5, {4.0, {BrightnessUnit::Kind::RayleighJeans, 1e-3}}, 80};
    spec.te_correlation = 0.3;
    return spec;
}

SpectrumSources sources() {
    SpectrumSources out;
    out.intensity_reference = out.polarization_reference = Frequency::from_ghz(0.408);
    out.polarized = true;
    return out;
}

TEST(DetailSpectrum, HasItsAmplitudeAtThePivot) {
    const auto sky = make_sky_spectra(given(), sources(), 200);
    // D_l = l (l + 1) C_l / 2 pi
    EXPECT_NEAR(sky.tt[80] * 80 * 81 / (2 * constants::pi), 0.01, 1e-15);
    EXPECT_NEAR(sky.ee[80] * 80 * 81 / (2 * constants::pi), 4e-6, 1e-18);
    EXPECT_NEAR(sky.tt[160] / sky.tt[80], std::pow(2, -2.7), 1e-14);
    EXPECT_EQ(sky.tt[1], 0.0);
    EXPECT_DOUBLE_EQ(sky.bb[50], 0.35 * sky.ee[50]);
}

// What the templates hold and what is drawn have the sky's spectra together, TE too.
TEST(DetailSpectrum, CompletesTheTemplates) {
    const auto sky = make_sky_spectra(given(), sources(), 300);
    const Angle t = Angle::from_degrees(1), p = Angle::from_degrees(1.6);
    const auto added = make_complement(sky, t, p);
    const auto bt = make_gaussian_beam(t, 300).temperature;
    const auto bp = make_gaussian_beam(p, 300).polarization;
    EXPECT_EQ(added.capped, 0);
    for (std::size_t l = 2; l <= 300; ++l) {
        EXPECT_NEAR(bt[l] * bt[l] * sky.tt[l] + added.tt[l], sky.tt[l], 1e-15 * sky.tt[l]) << l;
        if (l == 2) continue;  // 1 - B_P^2 is all rounding there
        EXPECT_NEAR(bp[l] * bp[l] * sky.ee[l] + added.ee[l], sky.ee[l], 1e-15 * sky.ee[l]) << l;
        const double te = 0.3 * std::sqrt(sky.tt[l] * sky.ee[l]);
        const double drawn = added.correlation[l] * std::sqrt(added.tt[l] * added.ee[l]);
        EXPECT_NEAR(bt[l] * bp[l] * te + drawn, te, 1e-13 * te) << l;
    }
}

TEST(DetailSpectrum, CutsACorrelationAtOneAndSaysSo) {
    DetailSpec spec = given();
    spec.te_correlation = 0.95;
    const auto added = make_complement(make_sky_spectra(spec, sources(), 100), Angle::from_degrees(0.2),
                                       Angle::from_degrees(3));
    EXPECT_GT(added.capped, 10);
    EXPECT_GT(added.largest_correlation, 1.0);
    for (const double rho : added.correlation)
        EXPECT_LE(std::abs(rho), 1.0);
}

class SpectrumFile : public testing::Test {
  protected:
    void TearDown() override { std::filesystem::remove(path_); }
    SkySpectra read(const std::string& text, bool polarized = true) {
        std::ofstream(path_) << text;
        DetailSpec spec;
        spec.spectrum = path_;
        SpectrumSources from = sources();
        from.polarized = polarized;
        return make_sky_spectra(spec, from, 10);
    }

  private:
    std::filesystem::path path_ = std::filesystem::path(testing::TempDir()) / "foreglow_spectrum_test.csv";
};

TEST_F(SpectrumFile, IsReadAsItStands) {
    const auto sky = read("l,TT,EE,TE\n2,4,1,-1\n3,8,2,4\n");
    EXPECT_EQ(sky.tt[2], 4.0);
    EXPECT_EQ(sky.tt[4], 0.0);
    EXPECT_DOUBLE_EQ(sky.bb[3], 0.35 * 2);
    EXPECT_DOUBLE_EQ(sky.correlation[2], -0.5);
    EXPECT_DOUBLE_EQ(sky.correlation[3], 1.0);
    EXPECT_EQ(read("l,TT\n2,4\n", false).tt[2], 4.0);
}

TEST_F(SpectrumFile, IsRefusedWhereNoFieldHasSuchSpectra) {
    EXPECT_THROW(static_cast<void>(read("l,TT,EE,TE\n2,1,1,1.1\n")), DataError);
    EXPECT_THROW(static_cast<void>(read("l,TT,EE\n2,-1,1\n")), DataError);
    EXPECT_THROW(static_cast<void>(read("l,TT,EE\n2,1,1\n4,1,1\n")), DataError);
    EXPECT_THROW(static_cast<void>(read("l,TT,XX\n2,1,1\n")), DataError);
    EXPECT_THROW(static_cast<void>(read("TT,l\n2,1\n")), DataError);
    EXPECT_THROW(static_cast<void>(read("l,TT\n2,1\n")), InputError);  // IQU wants EE
}

}  // namespace
}  // namespace foreglow
