// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <span>
#include <vector>

#include "picture/sky_raster.h"
#include "sphere/grid.h"

namespace foreglow {

/// The map pixels under the 2 x 2 places in each pixel of an all-sky picture (Mollweide, longitude grows to
/// the left): what all pictures of maps on one grid share.
class SkyLattice {
  public:
    SkyLattice(const HealpixGrid& grid, int width, int height);

    [[nodiscard]] bool fits(const HealpixGrid& grid, int width, int height) const {
        return grid == grid_ && width == width_ && height == height_;
    }
    /// Returns the means over the places of each picture pixel, as make_all_sky_raster does for coarse maps.
    [[nodiscard]] SkyRaster sample(const SkyMap& map) const;

    static constexpr std::int32_t outside = -1;
    /// Writes the map pixels under the places of one row of a picture: [2][2 width], `outside` the ellipse
    /// -1.
    static void locate_row(const HealpixGrid& grid, int width, int height, int row,
                           std::span<std::int32_t> pixels);
    /// Writes one row of a raster from the values under its places.
    static void sample_row(const SkyMap& map, std::span<const std::int32_t> pixels, int row,
                           SkyRaster& raster);

  private:
    HealpixGrid grid_;
    int width_, height_;
    std::vector<std::int32_t> pixels_;  ///< [height][2][2 width]
};

}  // namespace foreglow
