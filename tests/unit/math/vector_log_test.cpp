// SPDX-License-Identifier: GPL-2.0-or-later
#include "math/vector_log.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>

namespace foreglow {
namespace {

// The oracle is the C library's log in long double.
TEST(VectorLog, AgreesWithTheLibraryOverItsRange) {
    double worst = 0;
    for (int i = -70000; i <= 70000; ++i) {
        const double x = std::exp(0.01 * i + 0.003);
        const long double exact = std::log(static_cast<long double>(x));
        worst =
            std::max(worst, static_cast<double>(std::abs(static_cast<long double>(vector_log(x)) - exact) /
                                                std::max(1.0L, std::abs(exact))));
    }
    EXPECT_LE(worst, 4e-16);  // the roundings of s, of the sum and of n ln 2
    EXPECT_EQ(vector_log(1.0), 0.0);
}

TEST(VectorLog, StepsWithoutAGapWhereTheExponentChanges) {
    for (const double x : {std::sqrt(0.5), 1.0, std::sqrt(2.0), 2.0}) {
        const double below = vector_log(std::nextafter(x, 0.0));
        const double above = vector_log(std::nextafter(x, 9.0));
        EXPECT_NEAR(below, std::log(x), 4e-16) << x;  // as above
        EXPECT_NEAR(above, std::log(x), 4e-16) << x;
    }
}

}  // namespace
}  // namespace foreglow
