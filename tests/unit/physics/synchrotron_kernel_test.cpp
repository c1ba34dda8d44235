// SPDX-License-Identifier: GPL-2.0-or-later
#include "physics/synchrotron_kernel.h"

#include <gsl/gsl_errno.h>
#include <gsl/gsl_sf_synchrotron.h>
#include <gtest/gtest.h>

#include <array>
#include <cmath>
#include <fstream>
#include <limits>
#include <sstream>
#include <string>
#include <vector>

#include "base/constants.h"
#include "base/error.h"

namespace foreglow {
namespace {

std::vector<std::array<double, 5>> reference_rows() {
    std::ifstream file(std::string(FOREGLOW_TESTS_DIR) + "/oracle/synchrotron_kernel.csv");
    std::vector<std::array<double, 5>> rows;
    std::string line;
    while (std::getline(file, line)) {
        if (line.empty() || (std::isdigit(static_cast<unsigned char>(line[0])) == 0)) continue;
        std::istringstream cells(line);
        std::array<double, 5> row{};
        for (double& value : row) {
            std::string cell;
            std::getline(cells, cell, ',');
            value = std::stod(cell);
        }
        rows.push_back(row);
    }
    return rows;
}

// From outside: mpmath, 28 digits, tests/oracle/synchrotron_kernel_reference.py.
TEST(SynchrotronKernel, AgreesWithMpmathFromTheSmallestToTheLargestArgument) {
    const auto rows = reference_rows();
    ASSERT_GT(rows.size(), 40U);
    for (const auto& [x, f, g, r, polarized] : rows) {
        EXPECT_NEAR(kernel_f(x) / f, 1, 1e-12) << x;
        EXPECT_NEAR(kernel_g(x) / g, 1, 1e-12) << x;
        EXPECT_NEAR(kernel_r(x) / r, 1, 1e-12) << x;
        EXPECT_NEAR(kernel_r_polarized(x) / polarized, 1, 1e-12) << x;
    }
}

// From outside: GSL's synchrotron functions, which mpmath confirms to 4e-14 where 1e-6 < x < 30.
TEST(SynchrotronKernel, AgreesWithGsl) {
    gsl_error_handler_t* const before = gsl_set_error_handler_off();
    for (double x = 1e-6; x < 30; x *= 1.0173) {
        EXPECT_NEAR(kernel_f(x) / gsl_sf_synchrotron_1(x), 1, 1e-12) << x;
        EXPECT_NEAR(kernel_g(x) / gsl_sf_synchrotron_2(x), 1, 1e-12) << x;
    }
    gsl_set_error_handler(before);
}

// Common practice: F's maximum 0.918 lies at x = 0.2858; its limits are Rybicki & Lightman 1979, eq. 6.34.
TEST(SynchrotronKernel, HasItsKnownMaximaAndLimits) {
    EXPECT_NEAR(kernel_f(0.2858122478458622), 0.9180123331839619, 1e-12);
    EXPECT_NEAR(kernel_g(0.4168769009746798), 0.6070472330, 1e-10);
    EXPECT_NEAR(kernel_r(0.22924863), 0.712562505228, 1e-12);
    EXPECT_NEAR(kernel_f_derivatives(0.2858122478458622).first, 0, 1e-12);
    const double leading = 2.149528241534479;
    for (const double x : {1e-300, 1e-100, 1e-20}) {
        EXPECT_NEAR(kernel_f(x) / (leading * std::cbrt(x)), 1, 1e-12);  // the next term is (x)^(2/3) smaller
        EXPECT_NEAR(kernel_g(x) / (0.5 * leading * std::cbrt(x)), 1, 1e-12);
    }
    for (const double x : {400.0, 690.0, 720.0}) {
        const double wing = std::sqrt(constants::pi * x / 2) * std::exp(-x);
        EXPECT_NEAR(kernel_f(x) / wing, 1 + 55 / (72 * x), 1 / (x * x));  // the order that is left out
        EXPECT_NEAR(kernel_g(x) / wing, 1 + 7 / (72 * x), 1 / (x * x));
        EXPECT_NEAR(kernel_r(x) / (constants::pi / 2 * std::exp(-x)), 1 - 11 / (18 * x), 2 / (x * x));
    }
    for (const auto kernel : {kernel_f, kernel_g, kernel_r, kernel_r_polarized}) {
        EXPECT_EQ(kernel(0), 0);
        EXPECT_EQ(kernel(1e4), 0);
        EXPECT_EQ(kernel(std::numeric_limits<double>::infinity()), 0);
        EXPECT_TRUE(std::isnan(kernel(std::nan(""))));
        EXPECT_THROW(static_cast<void>(kernel(-1e-9)), ContractError);
    }
}

// int F = 8 pi/(9 sqrt 3), int G = 2 pi/(3 sqrt 3) (Rybicki & Lightman 1979, eq. 6.35 at mu = 0); the mean of
// sin^2 halves the angle's integral: int R = (2/3) int F.
TEST(SynchrotronKernel, HasItsKnownIntegrals) {
    std::array<double, 4> sums{};
    const double step = 0.02;
    for (double u = -45; u < 6; u += step) {
        const double x = std::exp(u);
        sums[0] += step * x * kernel_f(x);
        sums[1] += step * x * kernel_g(x);
        sums[2] += step * x * kernel_r(x);
        sums[3] += step * x * kernel_r_polarized(x);
    }
    const double f = 8 * constants::pi / (9 * std::sqrt(3.0));
    const double g = 2 * constants::pi / (3 * std::sqrt(3.0));
    EXPECT_NEAR(sums[0], f, 1e-12);
    EXPECT_NEAR(sums[1], g, 1e-12);
    EXPECT_NEAR(sums[2], 2.0 / 3 * f, 1e-12);
    EXPECT_NEAR(sums[3], 2.0 / 3 * g, 1e-12);
}

TEST(SynchrotronKernel, DerivativesAreThoseOfTheKernels) {
    const auto check = [](double (*kernel)(double), KernelDerivatives (*derivatives)(double), double x) {
        const double h = 1e-3;
        const auto at = [&](int k) { return kernel(x * std::exp(k * h)); };
        const KernelDerivatives d = derivatives(x);
        EXPECT_EQ(d.value, at(0));
        const double scale = std::abs(d.value) * (1 + x) * (1 + x);
        const double first = (8 * (at(1) - at(-1)) - (at(2) - at(-2))) / (12 * h);
        const double second = (16 * (at(1) + at(-1)) - (at(2) + at(-2)) - 30 * at(0)) / (12 * h * h);
        EXPECT_NEAR(d.first, first, 1e-9 * scale * (1 + x)) << x;  // h^4 times the fifth derivative
        EXPECT_NEAR(d.second, second, 1e-8 * scale * (1 + x)) << x;
    };
    for (double x = 1e-9; x < 60; x *= 1.7) {
        check(kernel_f, kernel_f_derivatives, x);
        check(kernel_g, kernel_g_derivatives, x);
        check(kernel_r, kernel_r_derivatives, x);
    }
}

// The series and the tables meet at x = 1, two tables at 4 and at 16.
TEST(SynchrotronKernel, HasNoStepWhereItsFormulasMeet) {
    for (const auto kernel : {kernel_f, kernel_g, kernel_r, kernel_r_polarized})
        for (const double x : {1.0, 4.0, 16.0}) {
            const double below = kernel(std::nextafter(x, 0.0));
            EXPECT_NEAR(kernel(std::nextafter(x, 20.0)) / below, 1, 1e-13);
        }
}

// c1 = 3 e/(4 pi m^3 c^5) from CODATA 2018, worked out by hand in SI: 16.080249143541 MHz for 1 uG and 1 GeV.
TEST(SynchrotronKernel, KnowsTheCriticalFrequency) {
    EXPECT_NEAR(critical_frequency(1, 1).hz() / 16.080249143541e6, 1, 1e-12);
    EXPECT_NEAR(critical_frequency(10, 5).ghz(), 16.080249143541e-3 * 500, 1e-11);
    EXPECT_NEAR(energy_radiating_at(critical_frequency(7.3, 2.2), 2.2), 7.3, 1e-14 * 7.3);
    EXPECT_THROW(static_cast<void>(energy_radiating_at(Frequency::from_ghz(1), 0)), ContractError);
}

}  // namespace
}  // namespace foreglow
