// SPDX-License-Identifier: GPL-2.0-or-later
#include "math/least_squares.h"

#include <gtest/gtest.h>

#include <cmath>

namespace foreglow {
namespace {

TEST(LeastSquares, FindsTheLineThroughPointsByHand) {
    // y = 1 + 2x at 0, 1, 2 with residuals (+1, -2, +1), which are orthogonal to 1 and x: the fit is the line
    // itself.
    Matrix a(3, 2);
    for (std::size_t i = 0; i < 3; ++i) {
        a(i, 0) = 1;
        a(i, 1) = static_cast<double>(i);
    }
    const auto x = solve_least_squares(a, {2, 1, 6});
    EXPECT_NEAR(x[0], 1.0, 1e-14);  // a few roundings
    EXPECT_NEAR(x[1], 2.0, 1e-14);
}

TEST(LeastSquares, LeavesAnOrthogonalResidual) {
    Matrix a(12, 5);
    std::vector<double> b(12);
    for (std::size_t i = 0; i < 12; ++i) {
        b[i] = std::sin(3.0 * static_cast<double>(i));
        for (std::size_t j = 0; j < 5; ++j)
            a(i, j) = std::pow(0.1 * static_cast<double>(i), static_cast<double>(j));
    }
    const auto x = solve_least_squares(a, b);
    for (std::size_t j = 0; j < 5; ++j) {
        double dot = 0;
        for (std::size_t i = 0; i < 12; ++i) {
            double fitted = 0;
            for (std::size_t k = 0; k < 5; ++k)
                fitted += a(i, k) * x[k];
            dot += a(i, j) * (b[i] - fitted);
        }
        EXPECT_NEAR(dot, 0.0, 1e-13);  // 12 products of order 1
    }
}

TEST(LeastSquares, LeavesOutAColumnThatRepeatsAnother) {
    Matrix a(3, 2);
    for (std::size_t i = 0; i < 3; ++i)
        a(i, 0) = a(i, 1) = static_cast<double>(i + 1);
    const auto x = solve_least_squares(a, {2, 4, 6});
    EXPECT_NEAR(x[0] + x[1], 2.0, 1e-14);
}

}  // namespace
}  // namespace foreglow
