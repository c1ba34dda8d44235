// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <span>
#include <vector>

namespace foreglow {

/// The Gaussian field whose exponential has a wanted spectrum.
struct LognormalSpectrum {
    std::vector<double> cl;  ///< [lmax + 1], of G
    double variance = 0;     ///< of G: sum (2l+1)/4pi C_l
    double clipped = 0;      ///< power put to 0 where it came out negative, as a share of the variance
};

/// Returns the spectrum of G such that delta = exp(G - var/2) - 1 has the spectrum asked for:
/// xi_G = ln(1 + xi_delta), C_l by Gauss-Legendre integration over 2 (lmax + 1) nodes (Coles & Jones 1991,
/// MNRAS 248, 1); negative C_l become 0.
/// @param cl  of delta, [lmax + 1]
/// @throws NumericError where xi_delta <= -1 somewhere: no lognormal field has such a spectrum
[[nodiscard]] LognormalSpectrum make_lognormal_spectrum(std::span<const double> cl);

}  // namespace foreglow
