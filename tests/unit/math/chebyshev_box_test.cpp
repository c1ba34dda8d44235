// SPDX-License-Identifier: GPL-2.0-or-later
#include "math/chebyshev_box.h"

#include <gtest/gtest.h>

#include <cmath>
#include <limits>

namespace foreglow {
namespace {

using Place = ChebyshevBox::Place;

double smooth(double s, double x, double y, double z) {
    return std::log(s + 2) * std::exp(0.3 * x) + std::sin(y) / (3 + z * s);
}

ChebyshevBox::Row row_of(double (*function)(double, double, double, double)) {
    return [function](const Place& place, std::span<const double> first, std::span<double> out) {
        for (std::size_t i = 0; i < first.size(); ++i)
            out[i] = function(first[i], place[1], place[2], place[3]);
    };
}

TEST(ChebyshevBox, MeetsASmoothFunctionOfOneToFourVariables) {
    for (const double width : {0.0, 1.0})
        for (const double tolerance : {1e-4, 1e-7, 1e-11}) {
            const std::array<Interval, 4> box{
                {{1, 7}, {-0.5, -0.5 + width}, {0, 2 * width}, {0.2, 0.2 + width}}};
            const ChebyshevBox fit(box, row_of(smooth), tolerance, -1e300);
            EXPECT_LE(fit.worst_error(), tolerance);
            EXPECT_EQ(fit.is_curve(), width == 0);
            for (double s = 1; s <= 7; s += 0.237)
                for (double f = 0; f <= 1; f += 0.31) {
                    const Place place{s, -0.5 + f * width, 2 * f * width, 0.2 + f * width};
                    const auto found = fit.value_and_slope(place);
                    // 1.2: the check grid and what is trimmed away are not these places.
                    EXPECT_NEAR(found.value, smooth(s, place[1], place[2], place[3]), 1.2 * tolerance);
                    const double h = 1e-4;
                    const double slope = (smooth(s + h, place[1], place[2], place[3]) -
                                          smooth(s - h, place[1], place[2], place[3])) /
                                         (2 * h);
                    EXPECT_NEAR(found.slope, slope, 1e-8 + 300 * tolerance);  // degree^2 times the error
                }
        }
}

TEST(ChebyshevBox, EvaluatesManyPlacesAsOneClampsThemAndKeepsNaN) {
    const ChebyshevBox fit({{{1, 3}, {2, 2}, {0, 0}, {0, 0}}}, row_of(smooth), 1e-10, -1e300);
    std::vector<double> places{1, 1.7, 2.9, 0.5, 3.5, std::numeric_limits<double>::quiet_NaN()};
    std::vector<double> out(places.size());
    fit.evaluate_first(places, out);
    for (std::size_t i = 0; i < 3; ++i)
        EXPECT_NEAR(out[i], fit.value({places[i], 2, 0, 0}), 1e-14);
    EXPECT_EQ(out[3], out[0]);
    EXPECT_NEAR(out[4], smooth(3, 2, 0, 0), 1e-9);
    EXPECT_TRUE(std::isnan(out[5]));
}

TEST(ChebyshevBox, SaysWhatItCouldNotReach) {
    const auto kink = [](const Place&, std::span<const double> first, std::span<double> out) {
        for (std::size_t i = 0; i < first.size(); ++i)
            out[i] = std::abs(first[i] - 0.31);
    };
    const ChebyshevBox fit({{{0, 1}, {0, 0}, {0, 0}, {0, 0}}}, kink, 1e-9, -1e300);
    EXPECT_GT(fit.worst_error(), 1e-5);
    EXPECT_LT(fit.worst_error(), 1e-2);  // a kink leaves 0.2/degree
    const ChebyshevBox below({{{0, 1}, {0, 0}, {0, 0}, {0, 0}}}, kink, 1e-9, 0.7);
    EXPECT_EQ(below.worst_error(), 0);  // nothing of it lies above the lowest that matters
}

TEST(ChebyshevBox, IsAConstantOnAPoint) {
    const ChebyshevBox fit({{{2, 2}, {1, 1}, {0, 0}, {0, 0}}}, row_of(smooth), 1e-12, -1e300);
    EXPECT_EQ(fit.value({2, 1, 0, 0}), smooth(2, 1, 0, 0));
    std::vector<double> out(2);
    fit.evaluate_first(std::vector<double>{2, 2}, out);
    EXPECT_EQ(out[1], smooth(2, 1, 0, 0));
}

}  // namespace
}  // namespace foreglow
