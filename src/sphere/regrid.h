// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <span>
#include <vector>

#include "sphere/converged_analysis.h"
#include "sphere/sky_map.h"

namespace foreglow {

/// Writes a scalar map at pixels first, first + 1, ... of another grid and frame: bilinear interpolation
/// between rings.
///
/// Undefined pixels of the stencil are left out and the weights of the others brought back to a sum of 1;
/// where none is defined, the result is undefined. On the map's own grid and frame it is a copy.
void interpolate_pixels(const SkyMap& map, const HealpixGrid& to_grid, Frame to_frame, std::int64_t first,
                        std::span<double> out);

/// Returns a scalar map on another grid and frame by interpolate_pixels.
[[nodiscard]] SkyMap interpolate(const SkyMap& map, const HealpixGrid& to_grid, Frame to_frame);

/// Returns the means of a map over the pixels of a coarser grid, undefined pixels left out.
///
/// With weights: sum |w| v / sum |w| over the children where both are defined; the plain mean of the defined
/// children where no weight is defined or all are 0. (Brightness as weight: an index map then keeps the total
/// of a power law to first order.)
/// @param values   [npix]
/// @param weights  [npix] or empty
/// @return         [npix of to_grid]; undefined where no child is defined
[[nodiscard]] std::vector<double> degrade(const HealpixGrid& grid, std::span<const double> values,
                                          const HealpixGrid& to_grid, std::span<const double> weights = {});

/// What a map's way through a_lm came to.
struct RegridReport {
    int lmax = 0;                ///< used
    std::int64_t filled = 0;     ///< undefined pixels of the input, filled for the transform
    std::int64_t undefined = 0;  ///< pixels of the result
    ConvergenceReport convergence;
};

struct RegriddedMap {
    SkyMap map;
    RegridReport report;
};

struct RegriddedStokes {
    StokesMaps maps;
    RegridReport report;
};

/// Brings a map to another grid and frame through a_lm up to lmax, at most 2.5 times the map's own nside.
///
/// Undefined pixels are filled first (fill.h). A pixel of the result is undefined where the bilinear stencil
/// at its centre takes more than 1 % of its weight from filled ones.
/// @param tolerance  of the a_lm, relative to the map's rms (analyse_converged)
/// @throws DataError where no pixel is defined
[[nodiscard]] RegriddedMap harmonic_regrid(const SkyMap& map, const HealpixGrid& to_grid, Frame to_frame,
                                           int lmax, double tolerance = 1e-6);
[[nodiscard]] RegriddedStokes harmonic_regrid(const StokesMaps& maps, const HealpixGrid& to_grid,
                                              Frame to_frame, int lmax, double tolerance = 1e-6);

/// Returns how much of a beam's weight comes from undefined pixels of a map, from 0 to 1, on another grid and
/// frame.
///
/// The 0/1 map of undefined pixels through a_lm times B_l / B_0; accurate to about 1e-3 for beams of 3 pixels
/// and more.
/// @param window  B_l [l], l = 0..lmax, B_0 not 0
/// @return        [npix of to_grid]
[[nodiscard]] std::vector<double> fraction_from_undefined(const SkyMap& map, std::span<const double> window,
                                                          const HealpixGrid& to_grid, Frame to_frame);

}  // namespace foreglow
