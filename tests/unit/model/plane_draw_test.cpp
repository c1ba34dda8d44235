// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/plane_draw.h"

#include <gtest/gtest.h>

#include <cmath>

#include "model/patch_beam.h"

namespace foreglow {
namespace {

std::vector<double> flat(int lmax, int first, double value) {
    std::vector<double> cl(static_cast<std::size_t>(lmax) + 1);
    for (std::size_t l = static_cast<std::size_t>(first); l < cl.size(); ++l)
        cl[l] = value;
    return cl;
}

TEST(PlaneDraw, HasTheVarianceOfItsModes) {
    const PlaneDraw plane(200, Angle::from_radians(1e-3));
    // White noise of C_l = C on pixels of side d has the variance C/d^2; half the plane's area lies beyond k0
    // = sqrt(2/pi) pi/d, inside the square of half side pi/d.
    const double c = 3e-6;
    EXPECT_NEAR(plane.variance(flat(plane.highest_l(), 0, c)), 3, 1e-9);
    const int first = static_cast<int>(std::sqrt(2 / M_PI) * M_PI / 1e-3);
    const auto upper = flat(plane.highest_l(), first, c);
    EXPECT_NEAR(plane.variance(upper), 1.5,
                0.01);  // modes on the circle's edge: 4 pi k0 over 4 (pi/d)^2 / dk
    double sum = 0;
    const auto image = plane.intensity(upper, {1, 0, "deep"});
    for (const double v : image)
        sum += v * v / static_cast<double>(image.size());
    EXPECT_NEAR(sum, 1.5, 5 * 1.5 * std::sqrt(2 / 20000.0));  // 20000 modes, five errors
    EXPECT_EQ(image, plane.intensity(upper, {1, 0, "deep"}));
    EXPECT_NE(image, plane.intensity(upper, {1, 0, "deeper"}));
    EXPECT_NE(image, plane.intensity(upper, {1, 1, "deep"}));
    EXPECT_NE(image, plane.intensity(upper, {2, 0, "deep"}));
}

// Of E alone; a wave along south or north has Q = +E, one along east or west Q = -E (HEALPix's signs).
TEST(PlaneDraw, HasThePolarizationOfHealpix) {
    const int n = 64;
    const PlaneDraw plane(n, Angle::from_radians(1e-3));
    DetailSpectra spectra;
    spectra.ee = flat(plane.highest_l(), 2, 1e-6);
    spectra.tt = spectra.ee;
    spectra.bb = flat(plane.highest_l(), 2, 0);
    spectra.correlation = flat(plane.highest_l(), 0, 1);
    const auto e = plane.intensity(spectra.tt, {1, 0, "x"});
    const StokesValues p = plane.polarization(spectra, {1, 0, "x"});
    // Sums along rows leave waves that run up and down: there E = T as drawn and Q = E. Along columns Q = -E.
    // The cut corner of the torus mixes waves a little, so the sums are compared by correlation.
    const auto correlate = [&](bool along_rows) {
        double cross = 0, own = 0, other = 0, u = 0;
        for (int a = 0; a < n; ++a) {
            double sum_e = 0, sum_q = 0, sum_u = 0;
            for (int b = 0; b < n; ++b) {
                const auto i = static_cast<std::size_t>(along_rows ? a * n + b : b * n + a);
                sum_e += e[i];
                sum_q += p.q[i];
                sum_u += p.u[i];
            }
            cross += sum_e * sum_q;
            own += sum_e * sum_e;
            other += sum_q * sum_q;
            u += sum_u * sum_u;
        }
        EXPECT_LT(u, 0.3 * other);
        return cross / std::sqrt(own * other);
    };
    EXPECT_GT(correlate(true), 0.9);
    EXPECT_LT(correlate(false), -0.9);
}

TEST(PatchBeam, SpreadsAPointAsAGaussian) {
    const int n = 61;
    const PatchBeam beam(n, Angle::from_degrees(0.1));
    Channel channel;
    channel.beam_fwhm = Angle::from_degrees(0.6);
    channel.beam = make_gaussian_beam(*channel.beam_fwhm, 10);
    std::vector<double> image(static_cast<std::size_t>(n * n));
    image[30 * 61 + 30] = 1;
    beam.apply(channel, image);
    double sum = 0;
    for (const double v : image)
        sum += v;
    EXPECT_NEAR(sum, 1, 1e-12);
    EXPECT_NEAR(image[30 * 61 + 33] / image[30 * 61 + 30], 0.5,
                1e-5);  // half the FWHM away; samples at 2.5 sigma^-1
    // A constant stays one: nothing leaks in from the edges.
    std::vector<double> constant(image.size(), 5.0);
    beam.apply(channel, constant);
    for (const double v : constant)
        EXPECT_NEAR(v, 5, 1e-12);
}

}  // namespace
}  // namespace foreglow
