// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/spectrum_fit.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>

#include "base/error.h"
#include "model/sky_region.h"
#include "sphere/beam.h"
#include "sphere/gaussian_field.h"
#include "sphere/harmonics.h"

namespace foreglow {
namespace {

std::vector<double> power_law(int lmax, double slope) {
    std::vector<double> cl(static_cast<std::size_t>(lmax) + 1);
    for (std::size_t l = 2; l < cl.size(); ++l)
        cl[l] = 0.02 * std::pow(static_cast<double>(l) / 60, slope);
    return cl;
}

TEST(SpectrumFit, FindsAPowerLaw) {
    const auto fit = fit_power_law(power_law(100, -2.6), {30, 89}, 0.5, "m.toml:1:1", "template");
    EXPECT_EQ(fit.bins.size(), 6U);
    EXPECT_DOUBLE_EQ(fit.pivot, std::sqrt(30.0 * 89));
    EXPECT_NEAR(fit.slope, -2.6, 0.005);  // the 1/nu of a logarithm's mean, which exact C_l do not have
    EXPECT_NEAR(fit.amplitude / (0.02 * std::pow(fit.pivot / 60, -2.6)), 1, 0.005);
    // first bin: nu = 0.5 sum over l = 30..39 of (2l+1) = 350
    EXPECT_DOUBLE_EQ(fit.bins[0].log_error, std::sqrt(2 / 350.0));
}

// Its errors are those of the scatter over draws, and it is not biased by the logarithm.
TEST(SpectrumFit, HasTheErrorsThatDrawsShow) {
    constexpr int draws = 200;
    double sum = 0, square = 0, amplitude = 0, error = 0, amplitude_error = 0;
    for (std::uint32_t r = 0; r < draws; ++r) {
        const auto truth = power_law(60, -2.6);
        auto cl = truth;
        for (std::uint32_t l = 20; l <= 60; ++l) {
            double chi2 = 0;
            for (std::uint32_t m = 0; m <= 2 * l; ++m)
                chi2 += std::pow(normal_pair({11, r, 1}, l, m)[0], 2);
            cl[l] *= chi2 / (2 * l + 1);
        }
        const auto fit = fit_power_law(cl, {20, 60}, 1, "here", "template");
        sum += fit.slope;
        square += fit.slope * fit.slope;
        amplitude += std::log(fit.amplitude / (0.02 * std::pow(fit.pivot / 60, -2.6)));
        error += fit.slope_error / draws;
        amplitude_error += fit.log_amplitude_error / draws;
    }
    const double mean = sum / draws, scatter = std::sqrt(square / draws - mean * mean);
    EXPECT_NEAR(mean, -2.6,
                4 * scatter / std::sqrt(draws) + 0.005);  // four errors
    EXPECT_NEAR(amplitude / draws, 0, 4 * amplitude_error / std::sqrt(draws) + 0.005);
    // the scatter of 200 draws is known to 5 %; where chi^2 is above 1 the errors are raised, by some 15 %
    EXPECT_NEAR(error / scatter, 1.1, 0.25);
}

TEST(SpectrumFit, RefusesWhatCannotBeContinued) {
    EXPECT_THROW(static_cast<void>(fit_power_law(power_law(100, -0.9), {30, 89}, 1, "here", "template")),
                 InputError);
    EXPECT_THROW(static_cast<void>(fit_power_law(power_law(100, -2.6), {30, 32}, 1, "here", "template")),
                 InputError);
}

TEST(SpectrumFit, TakesBeamAndMaskOutOfAMap) {
    const HealpixGrid grid(64);
    const Angle beam = Angle::from_degrees(2);
    Alm alm = make_gaussian_alm(power_law(128, -2.6), 128, {5, 0, 1});
    multiply_by_l(alm, make_gaussian_beam(beam, 128).temperature);
    SkyMap map{grid, Frame::Galactic, "K_RJ", synthesize(alm, grid)};
    for (std::size_t i = 0; i < map.values.size(); ++i) {
        const double b = grid.direction(static_cast<std::int64_t>(i))[2];
        map.values[i] += 7 + (std::abs(b) < 0.3 ? 100 : 0);  // the plane lies behind the cut
    }
    map.values[100] = undefined_pixel;
    const auto fit = fit_intensity(map, beam, Angle::from_degrees(20), {20, 55}, "here");
    // four of its own errors
    EXPECT_NEAR(fit.slope, -2.6, 4 * fit.slope_error);
    EXPECT_NEAR(std::log(fit.amplitude / (0.02 * std::pow(fit.pivot / 60, -2.6))), 0,
                4 * fit.log_amplitude_error);
    EXPECT_LT(fit.slope_error, 0.2);
    EXPECT_THROW(static_cast<void>(fit_intensity(map, beam, Angle::from_degrees(20), {20, 90}, "here")),
                 InputError);  // B_l^2 < 0.3
    AlmEB eb{alm, Alm(128)};
    const StokesValues stokes = synthesize_spin2(eb, grid);
    const auto polarized = fit_polarization({grid, Frame::Galactic, "K_RJ", stokes.q, stokes.u}, beam,
                                            Angle::from_degrees(0), {20, 55}, "here");
    EXPECT_NEAR(polarized.slope, -2.6, 4 * polarized.slope_error);
    EXPECT_DOUBLE_EQ(polarized.sky_fraction, 1.0);
}

TEST(SpectrumFit, ChoosesItsRangeFromTheBeam) {
    // B_l^2 = exp(-l^2 sigma^2) = 1/2 at l = sqrt(ln 2)/sigma, sigma = 1 deg/2.3548
    EXPECT_EQ(default_fit_lrange(Angle::from_degrees(1)).last, 112);
    EXPECT_EQ(default_fit_lrange(Angle::from_degrees(1)).first, 30);
    EXPECT_LT(default_fit_lrange(Angle::from_degrees(4)).first, 30);
}

TEST(SkyRegion, HasASoftEdgeOfTenDegreesInEveryFrame) {
    const HealpixGrid grid(16);
    for (const Frame frame : {Frame::Galactic, Frame::Icrs}) {
        const auto weights = make_latitude_weights(grid, frame, Angle::from_degrees(20));
        const Matrix3 to_galactic = rotation_between(frame, Frame::Galactic);
        for (std::size_t i = 0; i < weights.size(); ++i) {
            const double b =
                std::abs(std::asin(rotate(to_galactic, grid.direction(static_cast<std::int64_t>(i)))[2])) *
                57.29577951;
            const double edge = std::clamp((b - 20) / 10, 0.0, 1.0);
            EXPECT_NEAR(weights[i], 0.5 * (1 - std::cos(3.14159265358979 * edge)),
                        1e-7);  // of degrees near 20
        }
    }
    const auto all = make_latitude_weights(grid, Frame::Galactic, Angle::from_degrees(0));
    EXPECT_EQ(std::count(all.begin(), all.end(), 1.0), grid.npix());
}

}  // namespace
}  // namespace foreglow
