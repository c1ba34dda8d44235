// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <vector>

#include "base/quantity.h"
#include "sphere/sky_map.h"

namespace foreglow {

/// A map as seen through the pixels of a picture, row by row from the upper left corner.
struct SkyRaster {
    int width = 0, height = 0;
    std::vector<double>
        values;  ///< mean of the defined values in each picture pixel, NaN where there are none
    std::vector<float> undefined_shares;  ///< share of each picture pixel that is undefined sky, 0 to 1
};

/// Returns a raster without sky: values NaN and shares 0.
[[nodiscard]] SkyRaster make_empty_raster(int width, int height);

/// Tells whether a map is so fine that a picture averages over it (make_all_sky_raster); coarse maps are
/// sampled.
[[nodiscard]] bool is_finer_than_picture(const HealpixGrid& grid, int width, int height);

/// Projects a whole map on an ellipse (Mollweide) that touches all four sides; longitude grows to the left
/// from the centre.
///
/// Fine maps are averaged over each picture pixel, coarse ones are sampled at 2 x 2 places in it. Outside the
/// ellipse values are NaN and shares 0. The same for any number of threads.
/// @param width, height  in picture pixels; width = 2 height keeps areas equal
[[nodiscard]] SkyRaster make_all_sky_raster(const SkyMap& map, int width, int height);

/// Projects a square of the sky on the plane that touches it at its centre; north is up and longitude grows
/// to the left.
/// @param size   angle across the middle, up to 120 deg
/// @param width  of the square in picture pixels
[[nodiscard]] SkyRaster make_close_up_raster(const SkyMap& map, Angle longitude, Angle latitude, Angle size,
                                             int width);

}  // namespace foreglow
