// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <span>

#include "sphere/grid.h"

namespace foreglow {

/// Returns how many pixels are undefined.
[[nodiscard]] std::int64_t count_undefined(std::span<const double> values);

/// Gives undefined pixels smooth values made from their surroundings, so that a map can be transformed.
///
/// From coarse to fine: means of the defined children up to nside 1, then downwards bilinear interpolation of
/// the coarser level into the holes, each level smoothed by sweeps of neighbour means. Defined pixels keep
/// their values to the bit; filled ones stay within the range of the defined ones. For Q and U each is filled
/// as a scalar, which is fair away from the poles of the frame; within a few hole sizes of a pole the
/// meridians turn and the fill loses polarization there.
/// @param values  [npix], changed in place
/// @throws DataError where no pixel is defined
void fill_undefined(const HealpixGrid& grid, std::span<double> values);

}  // namespace foreglow
