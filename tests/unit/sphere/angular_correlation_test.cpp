// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/angular_correlation.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>

#include "base/constants.h"
#include "base/error.h"

namespace foreglow {
namespace {

// From outside: P_2(x) = (3 x^2 - 1)/2 at the Gauss-Legendre nodes of five points (Abramowitz & Stegun 1964,
// table 25.4), theta ascending.
TEST(AngularCorrelation, IsTheLegendreSum) {
    const AngularCorrelation transform(2, 5);
    const auto xi = transform.from_spectrum(std::vector<double>{0, 0, 4 * constants::pi / 5});
    const std::vector<double> nodes{0.906179845938664, 0.538469310105683, 0, -0.538469310105683,
                                    -0.906179845938664};
    for (std::size_t i = 0; i < nodes.size(); ++i)
        EXPECT_NEAR(xi[i], 0.5 * (3 * nodes[i] * nodes[i] - 1), 4e-15);  // digits printed in the table
}

TEST(AngularCorrelation, ComesBackExactly) {
    std::vector<double> cl(301);
    for (std::size_t l = 1; l < cl.size(); ++l)
        cl[l] = std::pow(static_cast<double>(l), -2.7);
    const AngularCorrelation transform(300, 602);
    const auto back = transform.to_spectrum(transform.from_spectrum(cl));
    for (std::size_t l = 0; l < cl.size(); ++l)
        EXPECT_NEAR(back[l], cl[l], 1e-14);  // rounding of sums over 602 nodes, C_1 = 1 the largest
    EXPECT_THROW(AngularCorrelation(10, 10), ContractError);
}

TEST(AngularCorrelation, StartsAtTheVariance) {
    const std::vector<double> cl{1, 0, 3};
    EXPECT_DOUBLE_EQ(variance_of_spectrum(cl), (1 + 5 * 3.0) / (4 * constants::pi));
}

}  // namespace
}  // namespace foreglow
