// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <vector>

#include "base/quantity.h"
#include "sphere/grid.h"

namespace foreglow {

/// Returns the pixels whose centres lie within a radius of a direction, ascending RING numbers.
/// @param center  unit vector in the grid's frame
/// @throws ContractError unless 0 <= radius <= 180 deg
[[nodiscard]] std::vector<std::int64_t> pixels_in_disc(const HealpixGrid& grid, const Vector3& center,
                                                       Angle radius);

}  // namespace foreglow
