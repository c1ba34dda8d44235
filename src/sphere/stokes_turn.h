// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include "sphere/frame.h"

namespace foreglow {

/// How Q and U change when they are read against other axes: (Q + iU)' = (Q + iU) (cosine + i sine).
struct StokesTurn {
    double cosine = 1, sine = 0;
};

/// Returns the turn at a direction from the meridians of one frame to those of another (COSMO).
///
/// With the new south axis at the angle psi from the old one through east, chi' = chi - psi, so that the
/// factor is exp(-2 i psi) (Gorski et al. 2005; common practice).
/// @param direction  unit vector in the old frame
/// @param rotation   takes unit vectors of the old frame to the new one
[[nodiscard]] StokesTurn turn_between_frames(const Vector3& direction, const Matrix3& rotation);

/// Returns the turn that carries Q and U along the great circle from one direction to another, against the
/// meridians of both (COSMO); none where the two are opposite.
/// @param from, to  unit vectors of one frame
[[nodiscard]] StokesTurn turn_along_great_circle(const Vector3& from, const Vector3& to);

/// Applies a turn to Q and U.
inline void apply(const StokesTurn& turn, double& q, double& u) {
    const double old_q = q;
    q = turn.cosine * old_q - turn.sine * u;
    u = turn.sine * old_q + turn.cosine * u;
}

}  // namespace foreglow
