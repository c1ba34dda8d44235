// SPDX-License-Identifier: GPL-2.0-or-later
#include "math/cubic_b_spline.h"

#include <gtest/gtest.h>

#include <cmath>
#include <vector>

namespace foreglow {
namespace {

double at(const std::vector<double>& c, double place) {
    const auto i = static_cast<std::size_t>(place);
    const BSplineWeights w = b_spline_weights(place - static_cast<double>(i));
    return w.value[0] * c[i - 1] + w.value[1] * c[i] + w.value[2] * c[i + 1] + w.value[3] * c[i + 2];
}

double slope_at(const std::vector<double>& c, double place) {
    const auto i = static_cast<std::size_t>(place);
    const BSplineWeights w = b_spline_weights(place - static_cast<double>(i));
    return w.slope[0] * c[i - 1] + w.slope[1] * c[i] + w.slope[2] * c[i + 1] + w.slope[3] * c[i + 2];
}

TEST(CubicBSpline, GoesThroughItsPoints) {
    std::vector<double> values;
    for (int i = 0; i < 40; ++i)
        values.push_back(std::sin(0.7 * i) + 0.1 * i * i);
    std::vector<double> coefficients = values;
    make_b_spline_coefficients(coefficients, 1);
    for (std::size_t i = 1; i + 2 < values.size(); ++i)
        EXPECT_NEAR(at(coefficients, static_cast<double>(i)), values[i], 1e-12 * 160) << i;  // rounding
}

TEST(CubicBSpline, FollowsASmoothFunctionToTheFourthOrder) {
    for (const double h : {0.1, 0.05}) {
        std::vector<double> c;
        for (int i = 0; i < 60; ++i)
            c.push_back(std::sin(h * i));
        make_b_spline_coefficients(c, 1);
        for (double place = 20.0; place < 40; place += 0.37) {  // 20 points from the ends: 0.27^20 = 4e-12
            EXPECT_NEAR(at(c, place), std::sin(h * place), h * h * h * h / 384 * 1.1)
                << place;  // h^4/384 |f4|
            EXPECT_NEAR(slope_at(c, place), h * std::cos(h * place), h * h * h * h / 24) << place;
        }
    }
}

TEST(CubicBSpline, TreatsColumnsApart) {
    std::vector<double> one, both;
    for (int i = 0; i < 12; ++i) {
        one.push_back(std::exp(0.3 * i));
        both.push_back(std::exp(0.3 * i));
        both.push_back(7.0 * i);
    }
    make_b_spline_coefficients(one, 1);
    make_b_spline_coefficients(both, 2);
    for (std::size_t i = 0; i < one.size(); ++i) {
        EXPECT_EQ(both[2 * i], one[i]);
        EXPECT_NEAR(both[2 * i + 1], 7.0 * static_cast<double>(i), 1e-12);  // a line is its own coefficients
    }
}

TEST(CubicBSpline, WeightsSumToOne) {
    for (double u = 0; u < 1; u += 0.1) {
        const BSplineWeights w = b_spline_weights(u);
        EXPECT_NEAR(w.value[0] + w.value[1] + w.value[2] + w.value[3], 1, 1e-15);
        EXPECT_NEAR(w.slope[0] + w.slope[1] + w.slope[2] + w.slope[3], 0, 1e-15);
    }
}

}  // namespace
}  // namespace foreglow
