// SPDX-License-Identifier: GPL-2.0-or-later
#include "estimate/noise_window.h"

#include <gtest/gtest.h>

#include <cmath>

#include "base/constants.h"
#include "sphere/beam.h"

namespace foreglow {
namespace {

// A narrow Gaussian squared is a Gaussian of sigma/sqrt(2) times 1/(4 pi sigma^2); the sphere's curvature
// adds terms of order sigma^2.
TEST(NoiseWindow, IsThatOfTheSquaredGaussian) {
    const Angle fwhm = Angle::from_degrees(2);
    const double sigma = fwhm.radians() / std::sqrt(8 * std::log(2.0));
    const auto window = make_gaussian_beam(fwhm, 500).temperature;
    const double total = squared_kernel_integral(window);
    EXPECT_NEAR(total * 4 * constants::pi * sigma * sigma, 1, sigma * sigma);
    const auto squared = make_squared_window(window, 300);
    EXPECT_NEAR(squared[0] / total, 1, 1e-10);
    for (const int l : {10, 50, 100, 200}) {
        const double expected = std::exp(-0.25 * l * (l + 1) * sigma * sigma);
        EXPECT_NEAR(squared[static_cast<std::size_t>(l)] / total, expected, sigma * sigma) << l;
    }
}

// W_1 of a kernel of l = 0 and 1 alone, by hand: K = (1 + 3 b x)/4 pi, 2 pi integral of K^2 x dx = 6 b * 2/3
// / (8 pi).
TEST(NoiseWindow, IsExactForFewTerms) {
    const double b = 0.4;
    const auto squared = make_squared_window(std::vector{1.0, b}, 3);
    EXPECT_NEAR(squared[0], (1 + 3 * b * b) / (4 * constants::pi), 1e-15);
    EXPECT_NEAR(squared[1], 4 * b / (8 * constants::pi), 1e-15);
    EXPECT_NEAR(squared[2], 9 * b * b * (4.0 / 15) / (8 * constants::pi), 1e-15);
    EXPECT_NEAR(squared[3], 0, 1e-15);
}

}  // namespace
}  // namespace foreglow
