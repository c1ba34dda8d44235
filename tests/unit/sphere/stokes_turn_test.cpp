// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/stokes_turn.h"

#include <gtest/gtest.h>

#include <cmath>

#include "base/constants.h"
#include "sphere/harmonics.h"
#include "sphere/rotation.h"
#include "sphere/sky_position.h"

namespace foreglow {
namespace {

constexpr double degree = constants::pi / 180;

TEST(TurnBetweenFrames, AgreesWithTheRotationOfHarmonics) {
    // A band-limited sky of one E and one B mode, made in both frames at the same place of the sky.
    const HealpixGrid from_grid(32);
    AlmEB alm{Alm(4), Alm(4)};
    alm.e(3, 1) = {0.7, -0.4};
    alm.b(4, 2) = {-0.3, 0.9};
    AlmEB turned = alm;
    rotate_alm(turned, Frame::Galactic, Frame::Icrs);
    const StokesValues old_values = synthesize_spin2(alm, from_grid);
    const StokesValues new_values = synthesize_spin2(turned, from_grid);
    const Matrix3 rotation = rotation_between(Frame::Galactic, Frame::Icrs);
    int compared = 0;
    for (std::int64_t p = 0; p < from_grid.npix(); p += 97) {
        const Vector3 n = from_grid.direction(p);
        const auto i = static_cast<std::size_t>(p);
        const auto there = static_cast<std::size_t>(from_grid.pixel_at(rotate(rotation, n)));
        double q = old_values.q[i], u = old_values.u[i];
        apply(turn_between_frames(n, rotation), q, u);
        // The nearest pixel is up to 1.3 deg away; l = 4 modes of size 1 change by some 4 x 0.023 there, and
        // near a pole by the turn of the meridians, so those are left out.
        if (std::abs(rotate(rotation, n)[2]) > 0.9) continue;
        EXPECT_NEAR(q, new_values.q[there], 0.12) << p;
        EXPECT_NEAR(u, new_values.u[there], 0.12) << p;
        ++compared;
    }
    EXPECT_GT(compared, 90);
}

TEST(TurnBetweenFrames, IsTheKnownAngleOfARotationAboutTheLineOfSight) {
    // A frame turned by 30 deg about the x axis: at (1, 0, 0) south turns by 30 deg.
    const double c = std::cos(30 * degree), s = std::sin(30 * degree);
    const Matrix3 rotation{{{1, 0, 0}, {0, c, -s}, {0, s, c}}};
    double q = 1, u = 0;
    apply(turn_between_frames({1, 0, 0}, rotation), q, u);
    // A vector along the old south axis; R takes south (0,0,-1) to (0, s, -c): from the new south towards
    // east by 30 deg, so chi' = +30 deg. Some roundings.
    EXPECT_NEAR(0.5 * std::atan2(u, q), 30 * degree, 1e-15);
}

TEST(TurnAlongGreatCircle, KeepsTheAngleToTheCircle) {
    // Along the equator and along a meridian nothing turns.
    for (const auto& [a, b] : {std::pair(SkyPosition{10, 0}, SkyPosition{80, 0}), {{33, -20}, {33, 65}}}) {
        const StokesTurn turn = turn_along_great_circle(direction_of(a), direction_of(b));
        EXPECT_NEAR(turn.cosine, 1, 1e-14);
        EXPECT_NEAR(turn.sine, 0, 1e-14);
    }
    // Across the pole from longitude 0 to 180 deg the meridians turn by 180 deg, Q and U not at all; to
    // longitude 90 deg near the pole a vector towards south turns against east: chi' = chi - 90 deg.
    const StokesTurn over = turn_along_great_circle(direction_of({0, 89}), direction_of({180, 89}));
    EXPECT_NEAR(over.cosine, 1, 1e-12);
    double q = 1, u = 0;
    apply(turn_along_great_circle(direction_of({0, 89.99}), direction_of({90, 89.99})), q, u);
    EXPECT_NEAR(q, -1, 1e-6);  // to the square of the distance, 1.7e-4 rad
    EXPECT_NEAR(u, 0, 1e-6);
}

TEST(TurnAlongGreatCircle, IsUndoneOnTheWayBackAndNothingForNoWay) {
    const Vector3 a = direction_of({200, 70}), b = direction_of({310, 40});
    double q = 0.3, u = -0.8;
    apply(turn_along_great_circle(a, b), q, u);
    EXPECT_GT(std::abs(q - 0.3), 0.1);
    apply(turn_along_great_circle(b, a), q, u);
    EXPECT_NEAR(q, 0.3, 1e-14);
    EXPECT_NEAR(u, -0.8, 1e-14);
    const StokesTurn none = turn_along_great_circle({1, 0, 0}, {1, 0, 0});
    EXPECT_EQ(none.cosine, 1);
    EXPECT_EQ(none.sine, 0);
}

}  // namespace
}  // namespace foreglow
