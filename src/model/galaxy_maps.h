// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstddef>
#include <span>
#include <vector>

#include "base/progress.h"
#include "base/quantity.h"
#include "model/galaxy_integral.h"
#include "model/galaxy_spec.h"
#include "sphere/grid.h"

namespace foreglow {

/// How finely lines of sight are sampled: steps of the midpoint rule near the plane (|b| < 5 deg) and
/// elsewhere, and what that leaves.
struct GalaxySampling {
    std::size_t steps_near_plane = 128, steps_elsewhere = 48;
    double error = 0;  ///< largest error of I, or of (Q, U), over I, on lines of sight all over the sky
};

/// Raises the steps until the change from doubling them, seen on some 400 lines of sight, is below the
/// Galaxy's tolerance; never below 128 and 48 for tolerances of 1e-3 and finer.
[[nodiscard]] GalaxySampling choose_sampling(const GalaxySpec& galaxy, const GalaxyIntegral& integral,
                                             bool polarized);

/// The Galaxy at some frequencies on a grid, galactic frame, RING order, K_RJ, COSMO.
struct GalaxyMaps {
    std::vector<Frequency> frequencies;        ///< [K]
    std::vector<std::vector<double>> i, q, u;  ///< [K][npix]; q and u empty without polarization
    std::vector<double> depth;                 ///< rotation measure of the whole line [rad/m^2], [npix]
    GalaxySampling sampling;
};

/// Integrates the Galaxy in every pixel: disc, turbulence, loops.
///
/// Pixels near the plane of grids coarser than nside 128 are means over the pixels of nside 128 (at least
/// four) that they hold, since the plane is thinner than they are. The same maps for any number of threads.
[[nodiscard]] GalaxyMaps make_galaxy_maps(const GalaxySpec& galaxy, const HealpixGrid& grid,
                                          std::span<const Frequency> frequencies, bool polarized,
                                          Progress& progress);

}  // namespace foreglow
