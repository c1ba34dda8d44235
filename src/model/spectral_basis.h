// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <vector>

#include "math/least_squares.h"
#include "model/sky_law.h"
#include "physics/response.h"

namespace foreglow {

/// A low-rank form of a spectral law over a set of channels: M_c(p) = sum over k of weights(c, k) S_k(p), p
/// the numbers of a pixel's law.
///
/// S_k is the sky in component band k: either the sky at one of K Chebyshev nodes in ln nu over the channels'
/// range, or, where that needs no fewer maps, the channels' own bands (then weights are the identity and
/// nothing is approximated).
struct SpectralBasis {
    std::vector<BandSum> components;  ///< [K]
    Matrix weights;                   ///< [channels][K]
    double worst_error = 0;           ///< largest relative error of any channel over the parameter range
    bool is_exact = false;            ///< components are the channels
};

/// Makes the smallest basis whose relative error stays below the tolerance for every channel over the range.
///
/// Weights by least squares on the relative error over a grid of the law's range (as for Chebyshev
/// interpolation, the error falls geometrically in K; Trefethen 2013, ch. 8); K grows until a denser grid
/// agrees.
/// @param channels   [channels], each in its own unit
/// @param tolerance  relative, above 1e-12
[[nodiscard]] SpectralBasis make_spectral_basis(const std::vector<BandSum>& channels, const SkyLaw& law,
                                                double tolerance);

}  // namespace foreglow
