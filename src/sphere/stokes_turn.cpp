// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/stokes_turn.h"

#include <cmath>

namespace foreglow {
namespace {

struct Axes {
    Vector3 south, east;
};

// At a pole the meridian of azimuth 0 is taken.
Axes axes_at(const Vector3& n) {
    const double rho = std::hypot(n[0], n[1]);
    const double cosine = rho > 0 ? n[0] / rho : 1.0;
    const double sine = rho > 0 ? n[1] / rho : 0.0;
    return {{n[2] * cosine, n[2] * sine, -rho}, {-sine, cosine, 0}};
}

double dot(const Vector3& a, const Vector3& b) {
    return a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
}

// exp(-2 i psi) from any positive multiple of (cos psi, sin psi).
StokesTurn twice_backwards(double cosine, double sine) {
    const double square = cosine * cosine + sine * sine;
    if (!(square > 0)) return {};
    return {(cosine * cosine - sine * sine) / square, -2 * cosine * sine / square};
}

}  // namespace

StokesTurn turn_between_frames(const Vector3& direction, const Matrix3& rotation) {
    const Axes old_axes = axes_at(direction);
    const Vector3 new_south = axes_at(rotate(rotation, direction)).south;
    return twice_backwards(dot(new_south, rotate(rotation, old_axes.south)),
                           dot(new_south, rotate(rotation, old_axes.east)));
}

StokesTurn turn_along_great_circle(const Vector3& from, const Vector3& to) {
    // The circle leaves `from` at the angle a from south through east, and arrives at the angle b: a
    // direction that keeps its angle to the circle changes by b - a against the meridians.
    const Axes there = axes_at(from);
    const Axes here = axes_at(to);
    const StokesTurn leaves = twice_backwards(dot(to, there.south), dot(to, there.east));
    const StokesTurn arrives = twice_backwards(-dot(from, here.south), -dot(from, here.east));
    return {leaves.cosine * arrives.cosine + leaves.sine * arrives.sine,
            leaves.sine * arrives.cosine - leaves.cosine * arrives.sine};
}

}  // namespace foreglow
