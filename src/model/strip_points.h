// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <span>
#include <vector>

#include "model/sky_model.h"

namespace foreglow {

/// Pixels of one ring among many that are asked for.
struct RingPlaces {
    int ring = 0;
    std::vector<std::size_t> places;  ///< in the list that was asked for
};

/// Sorts pixels by the ring that holds them, from the north.
[[nodiscard]] std::vector<RingPlaces> sort_by_ring(const HealpixGrid& grid,
                                                   std::span<const std::int64_t> pixels);

/// Makes single pixels of a sky, ring by ring, as make_sky_strip makes them.
/// @param pixels  RING numbers, in any order
[[nodiscard]] SkyStrip make_sky_points(const SkyModel& sky, std::span<const std::int64_t> pixels,
                                       bool with_polarization);

}  // namespace foreglow
