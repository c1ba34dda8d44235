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

/// A map's a_lm, holes filled first (fill.h), and where the holes were.
struct AnalysedMap {
    Alm alm;
    std::vector<double>
        filled;  ///< [npix], 1 where the map was undefined and else 0; empty where all was defined
    ConvergenceReport convergence;
};
struct AnalysedStokes {
    AlmEB alm;
    std::vector<double> filled;  ///< 1 where one of Q and U was undefined
    ConvergenceReport convergence;
};

/// Returns min(lmax, 2.5 nside): what lies above is aliased by the pixels beyond recovery (measured: the
/// refinement of analyse_converged contracts by 0.3 a step there, and not at all at 3 nside).
[[nodiscard]] int trusted_lmax(const HealpixGrid& grid, int lmax);

/// Fills a map and analyses it up to trusted_lmax.
/// @param tolerance  of the a_lm, relative to the map's rms (analyse_converged)
/// @throws DataError where no pixel is defined
[[nodiscard]] AnalysedMap analyse_filled(const SkyMap& map, int lmax, double tolerance);
[[nodiscard]] AnalysedStokes analyse_filled(const StokesMaps& maps, int lmax, double tolerance);

/// A pixel is undefined when more than this share of its weight comes from pixels that were filled.
inline constexpr double largest_filled_share = 0.01;

/// Brings a map to another grid and frame through its a_lm (analyse_filled).
///
/// A pixel of the result is undefined where the bilinear stencil at its centre takes more than
/// largest_filled_share of its weight from filled ones.
/// @throws DataError where no pixel is defined
[[nodiscard]] SkyMap harmonic_regrid(const SkyMap& map, const HealpixGrid& to_grid, Frame to_frame, int lmax,
                                     double tolerance = 1e-6);
[[nodiscard]] StokesMaps harmonic_regrid(const StokesMaps& maps, const HealpixGrid& to_grid, Frame to_frame,
                                         int lmax, double tolerance = 1e-6);

}  // namespace foreglow
