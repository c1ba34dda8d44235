// SPDX-License-Identifier: GPL-2.0-or-later
#include "estimate/scatter_fit.h"

#include <gtest/gtest.h>

#include <cmath>

#include "base/random.h"
#include "sphere/sky_map.h"

namespace foreglow {
namespace {

PairMoments moments_of(const std::vector<double>& x, const std::vector<double>& y, double vx, double vy) {
    PairMoments out;
    for (std::size_t i = 0; i < x.size(); ++i)
        out.add({1, x[i], y[i], x[i] * x[i], x[i] * y[i], y[i] * y[i], vx, vy});
    return out;
}

TEST(FitLine, FindsAnExactLineWhateverTheNoise) {
    const std::vector<double> x{1, 2, 4, 7}, y{5, 7, 11, 17};  // 2 x + 3
    for (const auto& [vx, vy] :
         std::vector<std::pair<double, double>>{{0, 0}, {0, 1}, {1, 0}, {1, 4}, {9, 1}}) {
        const Line line = fit_line(moments_of(x, y, vx, vy));
        EXPECT_NEAR(line.slope, 2, 1e-12) << vx << ", " << vy;
        EXPECT_NEAR(line.intercept, 3, 1e-11) << vx << ", " << vy;
    }
    const std::vector<double> down{-2, -4, -8, -14};
    EXPECT_NEAR(fit_line(moments_of(x, down, 1, 1)).slope, -2, 1e-12);
    EXPECT_NEAR(fit_line(moments_of(x, down, 0, 0)).slope, -2, 1e-12);
}

// The limits of the ratio of errors are the two plain regressions.
TEST(FitLine, LiesBetweenTheTwoRegressions) {
    const std::vector<double> x{0, 1, 2, 3}, y{0.1, 0.9, 2.3, 2.6};
    const PairMoments m = moments_of(x, y, 1, 1);
    const double forward = m.covariance() / m.variance_x(), reverse = m.variance_y() / m.covariance();
    EXPECT_DOUBLE_EQ(fit_line(moments_of(x, y, 0, 1)).slope, forward);
    EXPECT_NEAR(fit_line(moments_of(x, y, 1, 0)).slope, reverse, 1e-12);
    const double both = fit_line(m).slope;
    EXPECT_GT(both, forward);
    EXPECT_LT(both, reverse);
    // Equal errors: the principal axis of the covariance, tan(2 t) = 2 Sxy/(Sxx - Syy).
    const double angle = 0.5 * std::atan2(2 * m.covariance(), m.variance_x() - m.variance_y());
    EXPECT_NEAR(both, std::tan(angle), 1e-12);
}

SmoothedSurvey make_survey(double frequency, const std::vector<double>& values, double variance) {
    SmoothedSurvey survey;
    survey.frequency = Frequency::from_hz(frequency);
    survey.values = values;
    survey.variances = {variance};
    return survey;
}

TEST(ScatterCells, FindTheIndexThroughAnyZeroLevel) {
    const HealpixGrid grid(32);
    std::vector<double> low, high;
    const RandomKey key{3, 0, 0};
    const double ratio = std::pow(3.0, -2.7), noise = 0.01;
    for (std::int64_t p = 0; p < grid.npix(); ++p) {
        const auto a = normal_pair(key, static_cast<std::uint32_t>(p), 0);
        const auto b = normal_pair(key, static_cast<std::uint32_t>(p), 1);
        const double sky = 20 + 2 * a[0];
        low.push_back(sky + noise * b[0] - 7);
        high.push_back(ratio * sky + ratio * noise * b[1] + 3);
    }
    low[5] = undefined_pixel;
    const std::vector<SmoothedSurvey> surveys{make_survey(1e9, low, noise * noise),
                                              make_survey(3e9, high, ratio * ratio * noise * noise)};
    const auto cells = make_scatter_cells(grid, surveys, 2, true);
    ASSERT_EQ(cells.size(), 49U);  // all the sky, then 48 cells of nside 2
    EXPECT_EQ(cells[0].nside, 0);
    EXPECT_EQ(cells[0].pixels, grid.npix() - 1);
    double chi_square = 0;
    for (std::size_t i = 1; i < cells.size(); ++i) {
        chi_square += std::pow((cells[i].index + 2.7) / cells[i].index_error, 2);
        EXPECT_NEAR(cells[i].index, -2.7, 6 * cells[i].index_error);
    }
    // 48 pulls of a jackknife over 16 blocks (t of 15 degrees: variance 1.15): sum 55 with a scatter of 12.
    EXPECT_NEAR(chi_square, 55, 45);
    // ratio 20 + 3 = ratio (20 + 7 - 7) + ...: y = ratio x + 3 + 7 ratio.
    EXPECT_NEAR(cells[0].intercept, 3 + 7 * ratio, 4 * cells[0].intercept_error);
}

TEST(ScatterCells, CountCalibrationAmongTheErrors) {
    const HealpixGrid grid(8);
    std::vector<double> low, high;
    for (std::int64_t p = 0; p < grid.npix(); ++p) {
        low.push_back(10 + grid.direction(p)[0]);
        high.push_back(0.1 * low.back());
    }
    std::vector<SmoothedSurvey> surveys{make_survey(1e9, low, 1e-6), make_survey(2e9, high, 1e-8)};
    surveys[0].calibration_error = 0.03;
    surveys[1].calibration_error = 0.04;
    const auto with = make_scatter_cells(grid, surveys, 1, true);
    const auto without = make_scatter_cells(grid, surveys, 1, false);
    EXPECT_NEAR(with[0].index_error, 0.05 / std::log(2.0), 1e-9);  // the data are exact
    EXPECT_LT(without[0].index_error, 1e-9);
    EXPECT_EQ(with[0].index, without[0].index);
}

}  // namespace
}  // namespace foreglow
