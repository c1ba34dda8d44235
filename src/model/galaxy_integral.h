// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstddef>
#include <span>
#include <vector>

#include "model/galaxy_samples.h"
#include "model/galaxy_table.h"

namespace foreglow {

/// What one line of sight through the Galaxy's disc shows; frequencies as in the integral.
struct GalaxySightline {
    std::vector<double> i, q, u;  ///< K_RJ, COSMO, [K]; q and u empty without polarization
    double depth = 0;  ///< rotation measure of the whole line [rad/m^2], positive towards the observer
    double largest_depth = 0;    ///< largest |rotation measure| from the Sun to a place on the line [rad/m^2]
    double dispersion = 0;       ///< variance of the rotation measure [rad^2/m^4]
    double emitting_length = 0;  ///< (integral of j)^2/integral of j^2 at 408 MHz [kpc]
    double random_share = 0;     ///< (2/3) b^2/B_eff^2, weighted with the emission at 408 MHz
};

/// Integrates the emission of the disc along lines of sight for a few frequencies at once.
///
/// Emissivity from B_eff^2 = B_perp^2 + (2/3) b^2, polarized fraction Pi B_perp^2/B_eff^2 with Pi = (s +
/// 1)/(s + 7/3), s = 1 - 2 d ln Phi/d ln a of both populations together (Burn 1966, exact for s = 3);
/// midpoint rule in u, d(u) = start (e^u - 1); each step's Q + iU (COSMO) is turned and dimmed by what lies
/// in front of it, exp(-2 i RM lambda^2 - 2 S lambda^4), and averaged exactly over the step, (1 - e^-z)/z
/// with z = 2 i dRM lambda^2 + 2 dS lambda^4 (Burn 1966).
class GalaxyIntegral {
  public:
    /// @param frequencies  [K], any order
    GalaxyIntegral(const GalaxySpec& galaxy, const GalaxyTable& table,
                   std::span<const Frequency> frequencies);

    /// @param steps  of the midpoint rule, 1 or more
    [[nodiscard]] GalaxySightline sightline(const Vector3& direction, std::size_t steps,
                                            bool polarized) const;

    [[nodiscard]] std::size_t count() const { return nodes_.count() - 1; }

  private:
    GalaxySpec galaxy_;
    GalaxyShape shape_;
    GalaxyNodes nodes_;  ///< the frequencies and, last, 408 MHz
    std::vector<double> lambda2_;
    std::vector<double> kelvin_;  ///< brightness temperature per unit of the sum
};

}  // namespace foreglow
