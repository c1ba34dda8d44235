// SPDX-License-Identifier: GPL-2.0-or-later
#include "physics/brightness_unit.h"

#include <gtest/gtest.h>

#include "base/constants.h"
#include "base/error.h"

namespace foreglow {
namespace {

struct UnitCase {
    double ghz, kcmb_per_krj, mjysr_per_krj;
};

// From outside: Planck 2013 IX definitions evaluated by mpmath with CODATA 2018 and T_CMB = 2.7255 K;
// 100, 143, 217 GHz by astropy.units 5.2 (thermodynamic_temperature and brightness_temperature, T_cmb
// = 2.7255 K).
constexpr UnitCase cases[] = {
    {0.408, 1.000004301233, 0.005114370644496}, {30, 1.023472292418, 27.65122537033},
    {70, 1.133198953383, 150.5455603496},       {100, 1.286624230529, 307.2358374481},
    {143, 1.653629089097, 628.2665639976},      {217, 2.991333766166, 1446.742834959},
    {353, 12.90549557014, 3828.435046857}};

TEST(BrightnessUnit, AgreesWithPublishedFactors) {
    for (const UnitCase& one : cases) {
        const Frequency nu = Frequency::from_ghz(one.ghz);
        EXPECT_NEAR(1 / rayleigh_jeans_per_thermodynamic(nu) / one.kcmb_per_krj, 1.0, 1e-12)
            << one.ghz;  // 13 digits were printed
        const BrightnessUnit mjysr = *find_brightness_unit("MJy/sr");
        EXPECT_NEAR(1 / rayleigh_jeans_per_unit(mjysr, nu, 0) / one.mjysr_per_krj, 1.0, 1e-12) << one.ghz;
    }
}

TEST(BrightnessUnit, ThermodynamicFactorIsSmoothWhereTheSeriesTakesOver) {
    // y = 1e-4 lies near 11.36 MHz; the factor there is 1 - y^2/3 to 1e-16.
    const double hz = 2e-4 * constants::boltzmann * constants::t_cmb / constants::planck;
    const double below = rayleigh_jeans_per_thermodynamic(Frequency::from_hz(hz * 0.999999));
    const double above = rayleigh_jeans_per_thermodynamic(Frequency::from_hz(hz * 1.000001));
    EXPECT_NEAR(below, above, 1e-13);
    EXPECT_NEAR(1 / below, 1 + 4e-8 / 12, 1e-13);  // K_CMB/K_RJ = 1 + x^2/12 (common practice), x = 2e-4
}

TEST(BrightnessUnit, JanskyPerPixelIsMegajanskyPerSteradianTimesThePixel) {
    const double area = 4 * constants::pi / 49152;
    const Frequency nu = Frequency::from_ghz(100);
    const double per_mjysr = rayleigh_jeans_per_unit(*find_brightness_unit("MJy/sr"), nu, area);
    const double per_jypix = rayleigh_jeans_per_unit(*find_brightness_unit("Jy/pixel"), nu, area);
    EXPECT_NEAR(per_mjysr / per_jypix, 1e6 * area, 1e-9);  // of a value of 256: rounding
}

TEST(BrightnessUnit, TextAndUnitGoBothWays) {
    for (const char* text : {"K_RJ", "mK_RJ", "uK_RJ", "K_CMB", "mK_CMB", "uK_CMB", "MJy/sr", "Jy/pixel"})
        EXPECT_EQ(to_text(*find_brightness_unit(text)), text);
    for (const char* text : {"K", "mK", "uK", "unknown", "", "k_rj", "MJy"})
        EXPECT_FALSE(find_brightness_unit(text)) << text;
    EXPECT_NEAR(find_brightness_unit("uK_CMB")->scale, 1e-6, 0);
}

TEST(BrightnessUnit, ReadsABrightnessOrSaysWhatIsWrong) {
    EXPECT_EQ(parse_brightness("8.9 K_RJ").value, 8.9);
    EXPECT_THROW(static_cast<void>(parse_brightness("8.9")), InputError);
    EXPECT_THROW(static_cast<void>(parse_brightness("8.9 K")), InputError);
    EXPECT_THROW(static_cast<void>(parse_brightness("warm")), InputError);
}

}  // namespace
}  // namespace foreglow
