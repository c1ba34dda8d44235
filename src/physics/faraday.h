// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <complex>

#include "base/quantity.h"
#include "physics/response.h"

namespace foreglow {

// Depths are rotation measures [rad/m^2], positive where the field points to the observer; sigma is the rms
// of a random depth. Factors multiply Q + iU in the IAU convention, where the angle grows from north through
// east: chi = chi0 + RM lambda^2 (Burn 1966). In COSMO, U = -U_IAU, so that Q + iU is multiplied by the
// conjugate.

/// Returns lambda^2 = (c/nu)^2 [m^2].
[[nodiscard]] double lambda_squared(Frequency frequency);

/// Returns K n_e B_par L, K = e^3/(8 pi^2 eps0 m^2 c^3) = 0.8119 rad/m^2 per cm^-3 uG pc (CODATA 2018).
/// @param density_cm3  of thermal electrons; field_uG: along the line of sight, positive towards the observer
[[nodiscard]] double rotation_measure(double density_cm3, double field_uG, double length_pc);

/// Returns exp(2 i RM lambda^2), a screen in front of the emission.
[[nodiscard]] std::complex<double> screen_factor(double depth, double lambda2);

/// Returns exp(-2 sigma^2 lambda^4), what a screen of many cells with random depths leaves (Burn 1966).
[[nodiscard]] double screen_dispersion(double sigma, double lambda2);

/// Returns (1 - exp(-S))/S with S = 2 sigma^2 lambda^4 - 2 i R lambda^2: emission and rotation mixed evenly
/// in a slab of whole depth R and whole variance sigma^2 (Burn 1966; Sokoloff et al. 1998, eq. 34). The
/// observed rotation measure is R/2. Without dispersion it is sin(R lambda^2)/(R lambda^2) exp(i R lambda^2).
/// Relative error below 1e-14 for any S.
[[nodiscard]] std::complex<double> slab_factor(double depth, double sigma, double lambda2);

/// Where the emission is that a foreground of some depth rotates.
enum class FaradayEmission {
    Behind,  ///< all of it behind the rotating medium
    Mixed    ///< mixed with it evenly
};
[[nodiscard]] std::complex<double> faraday_factor(FaradayEmission emission, double depth, double sigma,
                                                  double lambda2);

/// Returns the average of a flat spectrum's factor over a band, sum of weights times factor over sum of
/// weights: bandwidth depolarization, where the band's nodes are close enough.
[[nodiscard]] std::complex<double> band_factor(const BandSum& band, FaradayEmission emission, double depth,
                                               double sigma);

}  // namespace foreglow
