// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <vector>

#include "model/galaxy_integral.h"
#include "model/galaxy_spec.h"
#include "sphere/grid.h"

namespace foreglow {

/// The Gaussian fields that turbulence draws on the sky, each of unit variance; [npix] each or empty.
///
/// C_l proportional to (l^2 + 18^2)^(-11/6), l >= 2, of brightness and polarization (E twice B), and to (l^2
/// + 18^2)^-1.3 of the index; normalised by the sum to infinity, drawn by (seed, field, l, m), so that every
/// nside shows the same sky, up to l = 2 nside.
struct TurbulenceFields {
    std::vector<double> brightness, q, u, index;
};
[[nodiscard]] TurbulenceFields make_turbulence_fields(const GalaxySpec& galaxy, const HealpixGrid& grid,
                                                      bool polarized);

/// What turbulence does to one pixel: a closure of ours, from how many turbulent cells a line of sight has.
struct TurbulencePixel {
    double factor = 1;    ///< on I, Q and U: exp(sigma g - sigma^2/2)
    double q = 0, u = 0;  ///< added to Q and U, times I and exp(-dispersion lambda^4/2)
};
/// sigma = min(0.6, 0.8 sqrt(2 L/L_eff)); Q, U += 0.45 f sqrt(2 L/L_eff) (q, u), f the random share.
/// @param g, q, u  the fields in this pixel
[[nodiscard]] TurbulencePixel turbulence_of(const GalaxySpec& galaxy, const GalaxySightline& line, double g,
                                            double q, double u);

}  // namespace foreglow
