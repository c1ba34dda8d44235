// SPDX-License-Identifier: GPL-2.0-or-later
#include "math/vector_exp.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <limits>

namespace foreglow {
namespace {

// The oracle is the C library's exp in long double.
TEST(VectorExp, AgreesWithTheLibraryOverItsRange) {
    double worst = 0;
    for (int i = -69900; i <= 69900; ++i) {
        const double x = 0.01 * i + 0.003;
        const long double exact = std::exp(static_cast<long double>(x));
        worst = std::max(
            worst, static_cast<double>(std::abs((static_cast<long double>(vector_exp(x)) - exact) / exact)));
    }
    EXPECT_LE(worst, 4e-16);  // two roundings of 1.1e-16 and one of r
    EXPECT_EQ(vector_exp(0.0), 1.0);
}

TEST(VectorExp, SingleIsGoodToWhatItPromises) {
    double worst = 0;
    for (int i = -69900; i <= 69900; ++i) {
        const double x = 0.01 * i + 0.003;
        worst = std::max(worst, std::abs(vector_exp<ExpPrecision::Single>(x) / std::exp(x) - 1));
    }
    EXPECT_LE(worst, 3e-10);  // (ln 2/2)^9/9! = 2.0e-10 and its tail
    EXPECT_GT(worst, 1e-11);  // the short polynomial is really used
}

TEST(VectorExp, KeepsNaN) {
    EXPECT_TRUE(std::isnan(vector_exp(std::numeric_limits<double>::quiet_NaN())));
}

}  // namespace
}  // namespace foreglow
