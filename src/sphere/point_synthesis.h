// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <span>
#include <vector>

#include "sphere/alm.h"
#include "sphere/frame.h"
#include "sphere/harmonics.h"

namespace foreglow {

/// Returns the values of a_lm at any directions, without the smoothing that interpolation between pixels
/// brings.
///
/// The field is made on a grid of colatitude and azimuth with 6 samples to the shortest wave, over the part
/// of the sky that the directions span, and interpolated by polynomials through 10 x 10 samples: relative
/// error below 1e-4 at l = lmax and 1e-6 at lmax/2 (measured). Meant for directions that lie close together.
/// @param directions  unit vectors
/// @return            [directions]; Q and U against the meridian of each direction, COSMO
[[nodiscard]] std::vector<double> synthesize_at(const Alm& alm, std::span<const Vector3> directions);
[[nodiscard]] StokesValues synthesize_at(const AlmEB& alm, std::span<const Vector3> directions);

}  // namespace foreglow
