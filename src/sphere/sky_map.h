// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cmath>
#include <limits>
#include <string>
#include <vector>

#include "sphere/frame.h"
#include "sphere/grid.h"

namespace foreglow {

/// The value of a pixel that no one measured; every reader turns sentinels into it and every writer turns it
/// back.
inline constexpr double undefined_pixel = std::numeric_limits<double>::quiet_NaN();
[[nodiscard]] inline bool is_defined(double value) {
    return !std::isnan(value);
}

/// One scalar map on the full sky, RING order: values [npix], undefined pixels are NaN.
struct SkyMap {
    HealpixGrid grid{1};
    Frame frame = Frame::Galactic;
    std::string unit;
    std::vector<double> values;
};

/// Linear polarization on the full sky, RING order, COSMO convention: Q and U [npix] each, undefined pixels
/// are NaN.
struct StokesMaps {
    HealpixGrid grid{1};
    Frame frame = Frame::Galactic;
    std::string unit;
    std::vector<double> q, u;
};

}  // namespace foreglow
