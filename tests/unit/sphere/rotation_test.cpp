// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/rotation.h"

#include <gtest/gtest.h>

#include "reference.h"
#include "sphere/harmonics.h"
#include "sphere/power_spectrum.h"
#include "sphere/projection.h"

namespace foreglow {
namespace {

using reference::closed_alm;
using reference::closed_alm_eb;
using reference::largest_difference;

// From outside: healpy 1.16 Rotator.rotate_alm of T, E and B, then alm2map; sphere_reference.py.
TEST(Rotation, AgreesWithHealpyForTemperatureAndPolarization) {
    const auto table = reference::read_table("synthesis");
    const HealpixGrid grid(16);
    const std::map<std::string, std::pair<Frame, Frame>> turns = {{"gc", {Frame::Galactic, Frame::Icrs}},
                                                                  {"cg", {Frame::Icrs, Frame::Galactic}},
                                                                  {"ge", {Frame::Galactic, Frame::Ecliptic}},
                                                                  {"eg", {Frame::Ecliptic, Frame::Galactic}}};
    for (const auto& [name, frames] : turns) {
        Alm t = closed_alm(24, 0.0);
        AlmEB eb = closed_alm_eb(24);
        rotate_alm(t, eb, frames.first, frames.second);
        const auto i = synthesize(t, grid);
        const auto qu = synthesize_spin2(eb, grid);
        for (std::size_t row = 0; row < table.at("pixel").size(); ++row) {
            const auto p = static_cast<std::size_t>(table.at("pixel")[row]);
            // healpy's frames differ by up to an arc second (5e-6 rad), times gradients of 10 or so; a wrong
            // sense or sign would differ by order 1
            EXPECT_NEAR(i[p], table.at("i_" + name)[row], 1e-4);
            EXPECT_NEAR(qu.q[p], table.at("q_" + name)[row], 1e-4);
            EXPECT_NEAR(qu.u[p], table.at("u_" + name)[row], 1e-4);
        }
    }
}

// From outside: the definition, g(R v) = f(v), with Y_lm from std::sph_legendre.
TEST(Rotation, MovesTheFieldWithTheDirections) {
    const int lmax = 6;
    const HealpixGrid grid(4);
    const Alm before = closed_alm(lmax, 0.0);
    Alm after = before;
    rotate_alm(after, Frame::Galactic, Frame::Icrs);
    const auto map = synthesize(after, grid);
    const auto back = rotation_between(Frame::Icrs, Frame::Galactic);
    for (std::int64_t p = 0; p < grid.npix(); ++p) {
        const auto [x, y, z] = rotate(back, grid.direction(p));
        double expected = 0;
        for (int m = 0; m <= lmax; ++m)
            for (int l = m; l <= lmax; ++l) {
                const auto phase = std::polar(1.0, m * std::atan2(y, x));
                expected +=
                    (m == 0 ? 1.0 : 2.0) * (before(l, m) * phase).real() *
                    std::sph_legendre(static_cast<unsigned>(l), static_cast<unsigned>(m), std::acos(z));
            }
        EXPECT_NEAR(map[static_cast<std::size_t>(p)], expected, 1e-12);  // the recursion's rounding
    }
}

// The polarization vector at a pixel, drawn from the angle of Q and U (COSMO: from south toward east), must
// turn as a vector.
TEST(Rotation, CarriesThePolarizationDirection) {
    const int lmax = 24;
    const HealpixGrid grid(16);
    const AlmEB before = closed_alm_eb(lmax);
    AlmEB after = before;
    rotate_alm(after, Frame::Galactic, Frame::Icrs);
    const auto matrix = rotation_between(Frame::Galactic, Frame::Icrs);
    const auto old_maps = synthesize_spin2(before, HealpixGrid(16));
    int checked = 0;
    // A fine grid, to find a pixel close to where the old one's centre goes.
    const HealpixGrid fine(1024);
    const auto new_maps = synthesize_spin2(after, fine);
    const auto axis = [](const Vector3& n, double q, double u) {
        const double rho = std::hypot(n[0], n[1]), chi = 0.5 * std::atan2(u, q);
        const Vector3 south{n[0] * n[2] / rho, n[1] * n[2] / rho, -rho}, east{-n[1] / rho, n[0] / rho, 0};
        Vector3 out{};
        for (std::size_t k = 0; k < 3; ++k)
            out[k] = std::cos(chi) * south[k] + std::sin(chi) * east[k];
        return out;
    };
    for (std::int64_t p = 5; p < grid.npix(); p += 31) {
        const auto i = static_cast<std::size_t>(p);
        if (std::hypot(old_maps.q[i], old_maps.u[i]) < 0.3) continue;  // no direction to speak of
        const Vector3 turned = rotate(matrix, axis(grid.direction(p), old_maps.q[i], old_maps.u[i]));
        const Vector3 there = rotate(matrix, grid.direction(p));
        const auto j = fine.pixel_at(there);
        if (std::abs(fine.direction(j)[2]) > 0.99) continue;  // the meridian turns within a pixel
        const Vector3 found = axis(fine.direction(j), new_maps.q[static_cast<std::size_t>(j)],
                                   new_maps.u[static_cast<std::size_t>(j)]);
        const double cosine = turned[0] * found[0] + turned[1] * found[1] + turned[2] * found[2];
        // half a pixel, 1.7 arcmin, times l = 24 over a relative amplitude of 0.3: below 0.05 rad, so cos
        // above 0.998
        EXPECT_GT(std::abs(cosine), 0.998) << p;
        ++checked;
    }
    EXPECT_GT(checked, 10);
}

TEST(Rotation, KeepsSpectraAndReturns) {
    Alm t = closed_alm(48, 0.0);
    AlmEB eb = closed_alm_eb(48);
    const Alm t0 = t;
    const AlmEB eb0 = eb;
    rotate_alm(t, eb, Frame::Icrs, Frame::Ecliptic);
    EXPECT_GT(largest_difference(t.values(), t0.values()), 0.01);
    // rounding, relative to C_l of order 1 / l^3
    EXPECT_LT(largest_difference(power_spectrum(eb.e), power_spectrum(eb0.e)), 1e-13);
    EXPECT_LT(largest_difference(power_spectrum(eb.b), power_spectrum(eb0.b)), 1e-13);
    EXPECT_LT(largest_difference(power_spectrum(t), power_spectrum(t0)), 1e-13);
    rotate_alm(t, eb, Frame::Ecliptic, Frame::Icrs);
    EXPECT_LT(largest_difference(t.values(), t0.values()), 1e-12);
    EXPECT_LT(largest_difference(eb.e.values(), eb0.e.values()), 1e-12);
    EXPECT_LT(largest_difference(eb.b.values(), eb0.b.values()), 1e-12);
}

TEST(Rotation, DoesNotDependOnThreadsOrCompany) {
    AlmEB first;
    for (const int threads : {1, 2, 4}) {
        const reference::Threads set(threads);
        AlmEB eb = closed_alm_eb(32);
        rotate_alm(eb, Frame::Galactic, Frame::Icrs);
        if (threads == 1) first = eb;
        EXPECT_EQ(eb, first);
    }
    Alm e = closed_alm_eb(32).e;
    rotate_alm(e, Frame::Galactic, Frame::Icrs);
    EXPECT_LT(largest_difference(e.values(), first.e.values()), 1e-13);
}

}  // namespace
}  // namespace foreglow
