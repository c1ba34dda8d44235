// SPDX-License-Identifier: GPL-2.0-or-later
#include "math/vector_sin_cos.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>

namespace foreglow {
namespace {

// The oracle is the C library in long double.
double worst_error(double x) {
    const SinCos got = vector_sin_cos(x);
    const auto exact = static_cast<long double>(x);
    return static_cast<double>(std::max(std::abs(static_cast<long double>(got.sin) - std::sin(exact)),
                                        std::abs(static_cast<long double>(got.cos) - std::cos(exact))));
}

TEST(VectorSinCos, AgreesWithTheLibraryInEveryQuadrant) {
    double worst = 0;
    for (int i = -20000; i <= 20000; ++i)
        worst = std::max(worst, worst_error(1e-3 * i));
    EXPECT_LE(worst, 3e-16);  // two roundings of 1.1e-16
    EXPECT_EQ(vector_sin_cos(0.0).sin, 0.0);
    EXPECT_EQ(vector_sin_cos(0.0).cos, 1.0);
}

TEST(VectorSinCos, StaysExactForLargeAngles) {
    for (double x = 100; x < 1e6; x *= 1.01) {
        EXPECT_LE(worst_error(x), 3e-16 + 1e-17 * x) << x;  // what the header promises
        EXPECT_LE(worst_error(-x), 3e-16 + 1e-17 * x) << x;
    }
}

}  // namespace
}  // namespace foreglow
