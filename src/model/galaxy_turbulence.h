// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <optional>
#include <span>
#include <vector>

#include "model/galaxy_integral.h"
#include "model/galaxy_spec.h"
#include "sphere/alm.h"
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
/// The a_lm of these fields, for a few pixels of a grid.
class TurbulenceWaves {
  public:
    TurbulenceWaves(const GalaxySpec& galaxy, const HealpixGrid& grid, bool polarized);

    /// Returns the fields on the whole grid, [npix].
    [[nodiscard]] TurbulenceFields everywhere() const;
    /// Returns the fields at RING pixels, [pixels]: only the rings that hold them are made.
    [[nodiscard]] TurbulenceFields at(std::span<const std::int64_t> pixels) const;

  private:
    HealpixGrid grid_;
    std::optional<Alm> brightness_, index_;
    std::optional<AlmEB> stokes_;
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
