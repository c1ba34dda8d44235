// SPDX-License-Identifier: GPL-2.0-or-later
#include "estimate/zero_level_fit.h"

#include <gtest/gtest.h>

#include <cmath>

#include "base/random.h"

namespace foreglow {
namespace {

// Two surveys of a sky of 20 +- 4 K whose index differs from cell to cell of nside 2 by an rms of `spread`.
std::vector<SmoothedSurvey> make_surveys(const HealpixGrid& grid, double spread,
                                         const std::vector<double>& levels, std::uint32_t realization) {
    const RandomKey key{11, realization, 0};
    const HealpixGrid cells(2);
    const std::vector<double> noise{0.02, 0.001};
    std::vector<SmoothedSurvey> surveys(2);
    for (std::size_t s = 0; s < 2; ++s) {
        surveys[s].frequency = Frequency::from_ghz(s == 0 ? 1 : 3);
        surveys[s].variances = {noise[s] * noise[s]};
        surveys[s].noise_area = grid.pixel_area();
        surveys[s].zero_level_error = 2 * levels[s];
    }
    for (std::int64_t p = 0; p < grid.npix(); ++p) {
        const std::int64_t cell = cells.pixel_at(grid.direction(p));
        const double index = -2.7 + spread * normal_pair(key, static_cast<std::uint32_t>(cell), 9)[0];
        const auto sky = normal_pair(key, static_cast<std::uint32_t>(p), 0);
        const auto deviates = normal_pair(key, static_cast<std::uint32_t>(p), 1);
        const double brightness = 20 + 4 * sky[0];
        surveys[0].values.push_back(brightness + levels[0] + noise[0] * deviates[0]);
        surveys[1].values.push_back(brightness * std::pow(3.0, index) + levels[1] + noise[1] * deviates[1]);
    }
    return surveys;
}

TEST(ZeroLevelFit, FindsBothLevelsWhereTheIndexVaries) {
    const HealpixGrid grid(32);
    const std::vector<double> levels{3, 0.2};
    for (const std::uint32_t realization : {0U, 1U, 2U}) {
        const auto surveys = make_surveys(grid, 0.2, levels, realization);
        const ZeroLevelFit fit = fit_zero_levels(grid, surveys, 2);
        EXPECT_TRUE(fit.converged);
        for (std::size_t s = 0; s < 2; ++s) {
            const double error = std::sqrt(fit.covariance(s, s));
            EXPECT_LT(error, 0.05 * levels[s]);  // the data say more than the prior of twice the level
            EXPECT_NEAR(fit.levels[s], levels[s], 4 * error);
        }
    }
}

TEST(ZeroLevelFit, FindsOnlyTheirCombinationWhereItDoesNot) {
    const HealpixGrid grid(32);
    const std::vector<double> levels{3, 0.2};
    const auto surveys = make_surveys(grid, 0.0, levels, 4);
    const ZeroLevelFit fit = fit_zero_levels(grid, surveys, 2);
    const double slope = std::pow(3.0, -2.7);
    const double variance =
        fit.covariance(1, 1) - 2 * slope * fit.covariance(0, 1) + slope * slope * fit.covariance(0, 0);
    const double found = fit.levels[1] - slope * fit.levels[0];
    EXPECT_NEAR(found, levels[1] - slope * levels[0], 4 * std::sqrt(variance));
    EXPECT_LT(std::sqrt(variance), 0.01 * levels[1]);
    // The pair itself is left to the prior: its errors stay above a tenth of that.
    EXPECT_GT(std::sqrt(fit.covariance(0, 0)), 0.1 * surveys[0].zero_level_error);
}

TEST(ZeroLevelFit, LeavesALevelThatIsKnown) {
    const HealpixGrid grid(32);
    auto surveys = make_surveys(grid, 0.2, {3, 0.2}, 5);
    for (double& value : surveys[1].values)
        value -= 0.2;
    surveys[1].zero_level_error = 0;
    const ZeroLevelFit fit = fit_zero_levels(grid, surveys, 2);
    EXPECT_EQ(fit.levels[1], 0);
    EXPECT_EQ(fit.covariance(1, 1), 0);
    EXPECT_NEAR(fit.levels[0], 3, 4 * std::sqrt(fit.covariance(0, 0)));
}

}  // namespace
}  // namespace foreglow
