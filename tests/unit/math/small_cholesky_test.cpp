// SPDX-License-Identifier: GPL-2.0-or-later
#include "math/small_cholesky.h"

#include <gtest/gtest.h>

#include <array>

namespace foreglow {
namespace {

// By hand: L = [[2, 0, 0], [1, 3, 0], [-1, 2, 1]].
TEST(SmallCholesky, FactorizesAndSolves) {
    std::array<std::array<double, 3>, 3> a{
        {{4, 9, 9}, {2, 10, 9}, {-2, 5, 6}}};  // above the diagonal: not read
    ASSERT_TRUE(factorize(a, 3));
    EXPECT_DOUBLE_EQ(a[1][0], 1);
    EXPECT_DOUBLE_EQ(a[1][1], 3);
    EXPECT_DOUBLE_EQ(a[2][0], -1);
    EXPECT_DOUBLE_EQ(a[2][1], 2);
    EXPECT_DOUBLE_EQ(a[2][2], 1);
    std::array<double, 3> b{4 * 1 + 2 * 2 - 2 * 3, 2 * 1 + 10 * 2 + 5 * 3,
                            -2 * 1 + 5 * 2 + 6 * 3};  // A (1, 2, 3)
    solve_lower(a, 3, b);
    solve_upper(a, 3, b);
    for (std::size_t i = 0; i < 3; ++i)
        EXPECT_NEAR(b[i], static_cast<double>(i + 1), 1e-14);  // small whole numbers, a few roundings
}

TEST(SmallCholesky, SaysWhereAMatrixIsNotPositive) {
    std::array<std::array<double, 2>, 2> singular{{{1, 0}, {1, 1}}};
    EXPECT_FALSE(factorize(singular, 2));
    std::array<std::array<double, 2>, 2> negative{{{-1, 0}, {0, 1}}};
    EXPECT_FALSE(factorize(negative, 2));
}

}  // namespace
}  // namespace foreglow
