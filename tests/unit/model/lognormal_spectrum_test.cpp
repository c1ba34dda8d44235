// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/lognormal_spectrum.h"

#include <gtest/gtest.h>

#include <cmath>

#include "base/constants.h"
#include "base/error.h"
#include "sphere/angular_correlation.h"

namespace foreglow {
namespace {

// A monopole alone has the same correlation everywhere, so xi_G = ln(1 + xi) is one number.
TEST(LognormalSpectrum, OfAConstantIsItsLogarithm) {
    const auto g = make_lognormal_spectrum(std::vector<double>{4 * constants::pi * 0.3, 0, 0, 0});
    EXPECT_NEAR(g.cl[0], 4 * constants::pi * std::log(1.3), 1e-13);  // rounding of values near 3
    EXPECT_NEAR(g.variance, std::log(1.3), 1e-14);
    for (std::size_t l = 1; l < g.cl.size(); ++l)
        EXPECT_NEAR(g.cl[l], 0, 1e-14);
}

TEST(LognormalSpectrum, GivesBackItsTargetThroughTheExponential) {
    const int lmax = 200;
    std::vector<double> target(lmax + 1);
    for (std::size_t l = 20; l < target.size(); ++l)
        target[l] = 0.4 * std::pow(static_cast<double>(l), -2.5);
    const auto g = make_lognormal_spectrum(target);
    const AngularCorrelation transform(lmax, 2 * (lmax + 1));
    auto xi = transform.from_spectrum(g.cl);
    for (double& value : xi)
        value = std::expm1(value);
    const auto found = transform.to_spectrum(xi);
    const double variance = variance_of_spectrum(target);
    EXPECT_GT(variance, 0.01);  // else the logarithm would not matter
    for (std::size_t l = 20; l < target.size(); ++l)
        EXPECT_NEAR(found[l] / target[l], 1, 0.01) << l;  // power above lmax that ln(1 + xi) has is cut off
    // ln(1 + sigma^2), less what the cut at lmax takes: of order sigma^4
    EXPECT_NEAR(g.variance, std::log(1 + variance), 2 * variance * variance);
}

TEST(LognormalSpectrum, RefusesACorrelationThatNoLognormalFieldHas) {
    EXPECT_THROW(static_cast<void>(make_lognormal_spectrum(std::vector<double>{0, 10.0, 0, 0})),
                 NumericError);
}

}  // namespace
}  // namespace foreglow
