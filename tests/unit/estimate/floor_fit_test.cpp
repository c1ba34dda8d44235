// SPDX-License-Identifier: GPL-2.0-or-later
#include "estimate/floor_fit.h"

#include <gtest/gtest.h>

#include <cmath>

#include "base/error.h"
#include "math/least_squares.h"
#include "sphere/sky_map.h"

namespace foreglow {
namespace {

const std::vector<double> test_ratios{-1.1, -0.4, 0.1, 0.3, 0.9, 1.6};
const std::vector<double> test_responses{2, 0.5, 1, 30, 7, 1e-3};

// A pixel with structure that no low polynomial has.
std::vector<double> make_pixel(double phase) {
    std::vector<double> out;
    for (std::size_t c = 0; c < test_ratios.size(); ++c)
        out.push_back(test_responses[c] *
                      std::exp(0.3 * test_ratios[c] + 0.05 * std::sin(5 * test_ratios[c] + phase)));
    return out;
}

// From inside, by another way: Householder QR of the weighted design (math/least_squares.h).
std::vector<double> residual_by_qr(const std::vector<double>& y, const std::vector<double>& sigma,
                                   int terms) {
    Matrix design(y.size(), static_cast<std::size_t>(terms));
    std::vector<double> right(y.size());
    for (std::size_t c = 0; c < y.size(); ++c) {
        for (std::size_t j = 0; j < design.columns; ++j)
            design(c, j) = std::pow(test_ratios[c], static_cast<double>(j)) / sigma[c];
        right[c] = y[c] / sigma[c];
    }
    const std::vector<double> solution = solve_least_squares(design, right);
    std::vector<double> out = y;
    for (std::size_t c = 0; c < y.size(); ++c)
        for (std::size_t j = 0; j < design.columns; ++j)
            out[c] -= solution[j] * std::pow(test_ratios[c], static_cast<double>(j));
    return out;
}

TEST(SubtractSmoothFit, IsTheLeastSquaresResidual) {
    const std::vector<double> sigma{1, 0.1, 3, 1, 0.5, 2};
    std::vector<double> weights;
    for (const double s : sigma)
        weights.push_back(1 / (s * s));
    for (int terms = 1; terms <= 5; ++terms) {
        std::vector<double> values = make_pixel(0.7);
        const auto expected = residual_by_qr(values, sigma, terms);
        subtract_smooth_fit(test_ratios, weights, terms, values);
        for (std::size_t c = 0; c < values.size(); ++c)
            EXPECT_NEAR(values[c], expected[c], 1e-12 * 30) << terms;  // the largest value is near 30
    }
}

TEST(FloorResiduals, LeaveNothingOfALawWithThatManyTerms) {
    FloorSetup setup;
    setup.log_ratios = test_ratios;
    setup.responses = test_responses;
    setup.terms = 3;
    std::vector<std::vector<double>> maps(6), residuals(6, std::vector<double>(1));
    for (std::size_t c = 0; c < 6; ++c)
        maps[c] = {test_responses[c] * 5 * std::exp((-0.4 + 0.2 * test_ratios[c]) * test_ratios[c])};
    const FloorCounts counts = make_floor_residuals(setup, maps, residuals);
    EXPECT_EQ(counts.fitted, 1);
    for (std::size_t c = 0; c < 6; ++c)
        EXPECT_NEAR(residuals[c][0] / maps[c][0], 0, 1e-14);  // tens of roundings
}

TEST(FloorResiduals, FollowTheDefinitionInEachForm) {
    const std::vector<double> noise{0.4, 0.2, 0.9, 3, 2, 1e-4};
    for (const bool in_log : {true, false})
        for (const bool weighted : {false, true}) {
            FloorSetup setup;
            setup.log_ratios = test_ratios;
            setup.responses = test_responses;
            setup.in_log = in_log;
            setup.terms = 2;
            if (weighted) setup.noise = noise;
            const std::vector<double> pixel = make_pixel(0.2);
            std::vector<std::vector<double>> maps(6), residuals(6, std::vector<double>(1));
            std::vector<double> values, sigma;
            for (std::size_t c = 0; c < 6; ++c) {
                maps[c] = {pixel[c]};
                const double y = pixel[c] / test_responses[c], s = noise[c] / test_responses[c];
                values.push_back(in_log ? std::log(y) : y);
                sigma.push_back(weighted ? (in_log ? s / y : s) : 1.0);
            }
            make_floor_residuals(setup, maps, residuals);
            const auto left = residual_by_qr(values, sigma, 2);
            for (std::size_t c = 0; c < 6; ++c) {
                const double fit = in_log ? std::exp(values[c] - left[c]) : values[c] - left[c];
                EXPECT_NEAR(residuals[c][0], pixel[c] - fit * test_responses[c], 1e-12 * pixel[c]);
            }
        }
}

TEST(FloorResiduals, CountWhatCannotBeFitted) {
    FloorSetup setup;
    setup.log_ratios = {-1, 0, 1};
    setup.responses = {1, 1, 1};
    setup.terms = 2;
    std::vector<std::vector<double>> maps{{1, -1, undefined_pixel}, {1, 2, -3}, {1, 2, 3}};
    std::vector<std::vector<double>> residuals(3, std::vector<double>(3));
    const FloorCounts counts = make_floor_residuals(setup, maps, residuals);
    EXPECT_EQ(counts.fitted, 1);
    EXPECT_EQ(counts.not_positive, 1);
    EXPECT_EQ(counts.undefined, 1);
    EXPECT_TRUE(std::isnan(residuals[0][1]) && std::isnan(residuals[2][2]));
    setup.in_log = false;
    EXPECT_EQ(make_floor_residuals(setup, maps, residuals).fitted, 2);
    setup.terms = 3;
    EXPECT_THROW(make_floor_residuals(setup, maps, residuals), ContractError);  // a fit through all points
}

}  // namespace
}  // namespace foreglow
