// SPDX-License-Identifier: GPL-2.0-or-later
#include "math/gauss_legendre.h"

#include <gtest/gtest.h>

#include <cmath>
#include <numeric>

#include "base/error.h"

namespace foreglow {
namespace {

// From outside: Abramowitz & Stegun 1964, table 25.4, n = 5 (15 digits printed).
TEST(GaussLegendre, AgreesWithTheHandbookForFivePoints) {
    const QuadratureRule rule = make_gauss_legendre(5);
    EXPECT_NEAR(rule.nodes[4], 0.906179845938664, 1e-15);
    EXPECT_NEAR(rule.nodes[3], 0.538469310105683, 1e-15);
    EXPECT_EQ(rule.nodes[2], 0.0);
    EXPECT_NEAR(rule.weights[4], 0.236926885056189, 1e-15);
    EXPECT_NEAR(rule.weights[3], 0.478628670499366, 1e-15);
    EXPECT_NEAR(rule.weights[2], 0.568888888888889, 1e-15);
}

TEST(GaussLegendre, IsExactUpToDegreeTwiceThePointsLessOne) {
    for (const int points : {1, 2, 3, 8, 31, 64, 256}) {
        const QuadratureRule rule = make_gauss_legendre(points);
        EXPECT_NEAR(std::accumulate(rule.weights.begin(), rule.weights.end(), 0.0), 2.0,
                    4e-15);  // a few roundings of 2
        const int even = 2 * points - 2;
        double sum = 0;
        for (std::size_t i = 0; i < rule.nodes.size(); ++i)
            sum += rule.weights[i] * std::pow(rule.nodes[i], even);
        EXPECT_NEAR(sum * (even + 1), 2.0, 2e-13) << points;  // node errors of 1e-16 times degree 510
    }
}

TEST(GaussLegendre, RefusesAnImpossibleNumberOfPoints) {
    EXPECT_THROW(static_cast<void>(make_gauss_legendre(0)), ContractError);
    EXPECT_THROW(static_cast<void>(make_gauss_legendre(257)), ContractError);
}

}  // namespace
}  // namespace foreglow
