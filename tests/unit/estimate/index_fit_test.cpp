// SPDX-License-Identifier: GPL-2.0-or-later
#include "estimate/index_fit.h"

#include <gtest/gtest.h>

#include <cmath>
#include <functional>

#include "base/error.h"
#include "base/random.h"
#include "sphere/sky_map.h"

namespace foreglow {
namespace {

struct Case {
    IndexFitSetup setup;
    std::vector<double> truth;  ///< K_RJ
    std::vector<double> variances;
};

// Surveys with ln(nu/nu0) = log_ratios of a sky of 10 K, index -2.8 and curvature c at nu0.
Case make_case(const std::vector<double>& log_ratios, const std::vector<double>& signal_to_noise,
               double curvature = 0, bool fits_curvature = false) {
    Case out;
    out.setup.log_ratios = log_ratios;
    out.setup.calibration_errors.assign(log_ratios.size(), 0.0);
    out.setup.zero_level_covariance = Matrix(log_ratios.size(), log_ratios.size());
    out.setup.curvature = fits_curvature;
    for (std::size_t i = 0; i < log_ratios.size(); ++i) {
        const double x = log_ratios[i];
        out.truth.push_back(10 * std::exp((-2.8 + curvature * x) * x));
        out.variances.push_back(std::pow(out.truth[i] / signal_to_noise[i], 2));
    }
    return out;
}

/// Of index and amplitude over many draws of all errors: the mean of answer - truth over the mean quoted
/// error, and the variance of (answer - truth)/error. (The mean of the latter is another thing: a pixel that
/// noise made faint quotes a larger error, so it is off by 1/(S/N) for an unbiased answer.)
struct Pulls {
    double index_bias = 0, index_variance = 0, amplitude_bias = 0, amplitude_variance = 0;
    int good = 0;
};
Pulls draw_pulls(const Case& one, int draws, const std::function<double(std::size_t, double)>& systematic) {
    Pulls out;
    double i1 = 0, i2 = 0, a1 = 0, a2 = 0, i_off = 0, i_error = 0, a_off = 0, a_error = 0;
    const RandomKey key{7, 0, 1};
    for (int n = 0; n < draws; ++n) {
        std::vector<double> data;
        for (std::size_t s = 0; s < one.truth.size(); ++s) {
            const auto deviates =
                normal_pair(key, static_cast<std::uint32_t>(n), static_cast<std::uint32_t>(s));
            data.push_back(one.truth[s] + std::sqrt(one.variances[s]) * deviates[0] +
                           systematic(s, deviates[1]));
        }
        const IndexFit fit = fit_index(one.setup, data, one.variances);
        if (fit.verdict != IndexVerdict::Good) continue;
        ++out.good;
        i_off += fit.index + 2.8;
        i_error += fit.index_error;
        a_off += fit.amplitude - 10;
        a_error += fit.amplitude_error;
        const double i = (fit.index + 2.8) / fit.index_error, a = (fit.amplitude - 10) / fit.amplitude_error;
        i1 += i;
        i2 += i * i;
        a1 += a;
        a2 += a * a;
    }
    const double n = out.good;
    out.index_bias = i_off / i_error;
    out.index_variance = i2 / n - i1 * i1 / (n * n);
    out.amplitude_bias = a_off / a_error;
    out.amplitude_variance = a2 / n - a1 * a1 / (n * n);
    return out;
}

double nothing(std::size_t, double) {
    return 0;
}

TEST(IndexFit, ReturnsTheLawThatTheDataFollow) {
    for (const bool linear : {false, true}) {
        const double ratio = linear ? 8.0 : 1e4;
        const Case one = make_case({-1, 0.3, 1.2, 2}, {ratio, ratio, ratio, ratio}, -0.05, true);
        const IndexFit fit = fit_index(one.setup, one.truth, one.variances);
        ASSERT_EQ(fit.verdict, IndexVerdict::Good);
        EXPECT_EQ(fit.in_linear_space, linear);
        // Exact data leave only the second-order bias correction, at most a few times 1/ratio^2 = 0.016.
        const double bias = linear ? 0.05 : 1e-7;
        EXPECT_NEAR(fit.index, -2.8, bias);
        EXPECT_NEAR(fit.curvature, -0.05, bias);
        EXPECT_NEAR(fit.amplitude, 10, 10 * bias);
    }
}

TEST(IndexFit, QuotesTheErrorOfAChordBetweenTwo) {
    const Case one = make_case({0, 1.5}, {50, 40});
    const IndexFit fit = fit_index(one.setup, one.truth, one.variances);
    // d beta = sqrt((dT1/T1)^2 + (dT2/T2)^2)/ln(nu2/nu1); the fit's own T differ from the data by 1/(2 50^2).
    EXPECT_NEAR(fit.index_error * 1.5, std::hypot(1 / 50.0, 1 / 40.0), 1e-5);
    EXPECT_NEAR(fit.amplitude_error, 10 / 50.0, 1e-4);
}

// From outside: the issue's own limits, bias below a tenth of the error and pulls of variance 0.9 to 1.1.
// Chance moves the mean of 4e4 pulls by 0.005 and their variance by 0.007.
TEST(IndexFit, HasPullsOfUnitVariance) {
    const std::vector<std::pair<std::vector<double>, std::vector<double>>> cases{
        {{0, 1.7}, {100, 50}}, {{0, 1.7}, {12, 11}},      {{0, 1.7}, {50, 6}},
        {{0, 1.7}, {6, 50}},   {{-1, 0.5, 1}, {8, 6, 5}}, {{-1, 0.5, 1.3, 2}, {20, 2, 5, 1}}};
    for (const auto& [log_ratios, ratios] : cases) {
        const Pulls pulls = draw_pulls(make_case(log_ratios, ratios), 40000, nothing);
        SCOPED_TRACE(::testing::Message() << "S/N " << ratios[0] << ", " << ratios[1]);
        EXPECT_GT(pulls.good, 39000);
        EXPECT_NEAR(pulls.index_bias, 0, 0.1);
        EXPECT_NEAR(pulls.index_variance, 1, 0.1);
        EXPECT_NEAR(pulls.amplitude_bias, 0, 0.1);
        EXPECT_NEAR(pulls.amplitude_variance, 1, 0.1);
    }
}

TEST(IndexFit, CountsZeroLevelsAndCalibrationAmongTheErrors) {
    Case one = make_case({-1, 0.5, 1.5}, {200, 200, 200});
    const std::vector<double> gain{0.03, 0.02, 0.05};
    one.setup.calibration_errors = gain;
    for (std::size_t s = 0; s < 3; ++s)
        one.setup.zero_level_covariance(s, s) = std::pow(0.02 * one.truth[s], 2);
    const auto systematic = [&](std::size_t s, double deviate) {
        // One deviate stands for both: their sum has this rms.
        return deviate * one.truth[s] * std::hypot(gain[s], 0.02);
    };
    const Pulls pulls = draw_pulls(one, 40000, systematic);
    EXPECT_NEAR(pulls.index_bias, 0, 0.1);
    EXPECT_NEAR(pulls.index_variance, 1, 0.05);  // chance 0.007; errors of 5 % make it no worse than that
    EXPECT_NEAR(pulls.amplitude_variance, 1, 0.05);
}

TEST(IndexFit, LeavesThemOutWithoutMovingTheAnswer) {
    Case one = make_case({-1, 0.5, 1.5}, {20, 30, 40});
    one.setup.calibration_errors = {0.1, 0.0, 0.02};
    one.setup.zero_level_covariance(1, 1) = 0.04;
    const IndexFit all = fit_index(one.setup, one.truth, one.variances);
    one.setup.common_errors = false;
    const IndexFit noise = fit_index(one.setup, one.truth, one.variances);
    EXPECT_EQ(all.index, noise.index);
    EXPECT_EQ(all.amplitude, noise.amplitude);
    EXPECT_LT(noise.index_error, all.index_error);
    EXPECT_GT(noise.index_error, 0);
}

TEST(IndexFit, TakesZeroLevelsThatGoTogether) {
    // Two surveys that are off by the same relative amount keep their ratio: the index does not feel it.
    Case one = make_case({0, 1.5}, {1e5, 1e5});
    for (std::size_t s = 0; s < 2; ++s)
        for (std::size_t t = 0; t < 2; ++t)
            one.setup.zero_level_covariance(s, t) =
                1e-4 * one.truth[s] * one.truth[t] * (s == t ? 1 + 1e-9 : 1);
    const IndexFit fit = fit_index(one.setup, one.truth, one.variances);
    EXPECT_LT(fit.index_error, 1e-4);                        // 1 % each, apart, would be 0.0094
    EXPECT_NEAR(fit.amplitude_error, 10 * 1e-2, 10 * 1e-4);  // the amplitude does
}

TEST(IndexFit, SaysWhyThereIsNoAnswer) {
    const Case one = make_case({0, 1.5, 1.5}, {100, 100, 100});
    const auto verdict = [&](double a, double b, double c) {
        return fit_index(one.setup, std::vector{a, b, c}, one.variances).verdict;
    };
    EXPECT_EQ(verdict(one.truth[0], one.truth[1], one.truth[2]), IndexVerdict::Good);
    EXPECT_EQ(verdict(one.truth[0], undefined_pixel, one.truth[2]), IndexVerdict::Good);
    EXPECT_EQ(verdict(undefined_pixel, one.truth[1], one.truth[2]), IndexVerdict::TooFew);  // one frequency
    EXPECT_EQ(verdict(-1, one.truth[1], undefined_pixel), IndexVerdict::NotPositive);
    EXPECT_EQ(verdict(one.truth[0], 0.01 * one.truth[1], undefined_pixel), IndexVerdict::Undecided);
}

TEST(IndexFit, RefusesSurveysThatDoNotMatchItsSetup) {
    const Case one = make_case({0, 1.5}, {100, 100});
    EXPECT_THROW(static_cast<void>(fit_index(one.setup, std::vector{1.0}, std::vector{1.0})), ContractError);
}

}  // namespace
}  // namespace foreglow
