// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/gaussian_field.h"

#include <gtest/gtest.h>

#include "base/constants.h"
#include "base/error.h"
#include "reference.h"
#include "sphere/power_spectrum.h"

namespace foreglow {
namespace {

// From outside: healpy 1.16 alm2cl, auto and cross, sphere_reference.py.
TEST(PowerSpectrum, AgreesWithHealpy) {
    const auto table = reference::read_table("spectra");
    const Alm a = reference::closed_alm(24, 0.0), b = reference::closed_alm(24, 1.0);
    const auto aa = power_spectrum(a), ab = cross_spectrum(a, b);
    for (std::size_t l = 0; l <= 24; ++l) {
        EXPECT_NEAR(aa[l], table.at("aa")[l], 1e-15);  // rounding of a mean of order 0.1
        EXPECT_NEAR(ab[l], table.at("ab")[l], 1e-15);
    }
    EXPECT_EQ(cross_spectrum(a, with_lmax(b, 10)).size(), 11u);
}

TEST(PowerSpectrum, GivesTheRmsOfTheMap) {
    const HealpixGrid grid(32);
    const Alm a = reference::closed_alm(24, 0.0, 2);
    double sum = 0;
    for (const double value : synthesize(a, grid))
        sum += value * value;
    // sums over pixels are exact to 1e-4 or so for products of l up to 24 at nside 32
    EXPECT_NEAR(rms_of_spectrum(power_spectrum(a)) / std::sqrt(sum / static_cast<double>(grid.npix())), 1.0,
                1e-3);
    EXPECT_DOUBLE_EQ(
        rms_of_spectrum(std::vector<double>{9, 9, 0, 4 * constants::pi}, std::vector<double>{1, 1, 1, 0.5}),
        std::sqrt(7.0) * 0.5);
}

TEST(GaussianField, HasTheSpectrumAskedFor) {
    const int lmax = 400;
    std::vector<double> cl(lmax + 1);
    for (std::size_t l = 2; l < cl.size(); ++l)
        cl[l] = std::pow(static_cast<double>(l), -2.5);
    const Alm alm = make_gaussian_alm(cl, lmax, {42, 0, 3});
    const auto found = power_spectrum(alm);
    double chi2 = 0, modes = 0;
    for (std::size_t l = 2; l < cl.size(); ++l) {
        const double n = 2.0 * static_cast<double>(l) + 1.0;
        chi2 += n * found[l] / cl[l];
        modes += n;
    }
    // the mean of N squared normal deviates scatters by sqrt(2 / N); five times that
    EXPECT_NEAR(chi2 / modes, 1.0, 5 * std::sqrt(2.0 / modes));
    // m = 0 has its own rule: real, with the whole variance
    double zero = 0;
    for (int l = 2; l <= lmax; ++l) {
        EXPECT_EQ(alm(l, 0).imag(), 0.0);
        zero += std::norm(alm(l, 0)) / cl[static_cast<std::size_t>(l)];
    }
    EXPECT_NEAR(zero / (lmax - 1), 1.0, 5 * std::sqrt(2.0 / (lmax - 1)));
    // and real and imaginary parts share alike where m > 0
    double re = 0, im = 0;
    for (int l = 2; l <= lmax; ++l)
        for (int m = 1; m <= l; ++m) {
            re += std::norm(alm(l, m).real()) / cl[static_cast<std::size_t>(l)];
            im += std::norm(alm(l, m).imag()) / cl[static_cast<std::size_t>(l)];
        }
    EXPECT_NEAR(re / im, 1.0, 5 * std::sqrt(4.0 / (modes / 2)));
}

TEST(GaussianField, KeepsItsModesAtAnyLmaxAndThreads) {
    const std::vector<double> cl(401, 1.0);
    const Alm coarse = make_gaussian_alm(cl, 200, {7, 1, 2}), fine = make_gaussian_alm(cl, 400, {7, 1, 2});
    EXPECT_EQ(with_lmax(fine, 200), coarse);
    for (const int threads : {1, 2, 4}) {
        const reference::Threads set(threads);
        EXPECT_EQ(make_gaussian_alm(cl, 200, {7, 1, 2}), coarse);
    }
    EXPECT_NE(make_gaussian_alm(cl, 200, {8, 1, 2}), coarse);
    EXPECT_NE(make_gaussian_alm(cl, 200, {7, 0, 2}), coarse);
    EXPECT_NE(make_gaussian_alm(cl, 200, {7, 1, 3}), coarse);
}

TEST(GaussianField, EndsWithItsSpectrumAndRefusesANegativeOne) {
    const Alm alm = make_gaussian_alm(std::vector<double>{0, 0, 1}, 4, {1, 0, 0});
    EXPECT_EQ(alm(3, 1), 0.0);
    EXPECT_EQ(alm(1, 0), 0.0);
    EXPECT_NE(alm(2, 1), 0.0);
    EXPECT_THROW((void)make_gaussian_alm(std::vector<double>{1, -1}, 4, {}), ContractError);
}

}  // namespace
}  // namespace foreglow
