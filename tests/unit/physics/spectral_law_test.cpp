// SPDX-License-Identifier: GPL-2.0-or-later
#include "physics/spectral_law.h"

#include <gtest/gtest.h>

#include <cmath>

namespace foreglow {
namespace {

TEST(SpectralLaw, SignTableHolds) {
    // Rybicki & Lightman eq. 6.22a: s = 1 - 2 alpha; flux indices of -0.75 to -0.5 are -2.75 to -2.5 in
    // brightness temperature, from electrons of slope 2.5 to 2 (common practice).
    EXPECT_DOUBLE_EQ(flux_index(-2.75), -0.75);
    EXPECT_DOUBLE_EQ(flux_index(-2.5), -0.5);
    EXPECT_DOUBLE_EQ(electron_slope(-2.75), 2.5);
    EXPECT_DOUBLE_EQ(electron_slope(-2.5), 2.0);
    for (const double beta : {-3.1, -2.7, -2.5})
        EXPECT_NEAR(electron_slope(beta), 1 - 2 * flux_index(beta), 1e-15);
}

TEST(SpectralLaw, LocalIndexIsTheDerivative) {
    const SpectralParameters p{-2.8, -0.05};
    for (const double x : {-3.0, -0.1, 0.0, 2.5}) {
        const double h = 1e-4;
        const double slope = (log_brightness_ratio(p, x + h) - log_brightness_ratio(p, x - h)) / (2 * h);
        EXPECT_NEAR(slope, local_index(p, x),
                    1e-11);  // central differences are exact for a parabola: rounding/h
    }
}

TEST(SpectralLaw, AnIndexMeasuredElsewhereIsCarriedToTheReference) {
    const double x1 = std::log(1e9 / 408e6);
    const double at_nu0 = index_at_reference(-2.7, -0.06, x1);
    EXPECT_NEAR(local_index({at_nu0, -0.06}, x1), -2.7, 1e-15);
}

TEST(SpectralLaw, ChordIsTheLocalIndexAtTheGeometricMean) {
    const SpectralParameters p{-2.6, -0.07};
    const double a = -0.4, b = 3.1;
    const double chord = (log_brightness_ratio(p, b) - log_brightness_ratio(p, a)) / (b - a);
    EXPECT_NEAR(chord, local_index(p, 0.5 * (a + b)), 1e-14);
}

}  // namespace
}  // namespace foreglow
