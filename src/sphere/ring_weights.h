// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <vector>

namespace foreglow {

/// The weights that make sums over HEALPix rings nearly exact quadratures: near 1, for rings 0 to 2 nside - 1
/// and their mirrors.
struct RingWeights {
    int nside = 0;
    std::vector<double> values;  ///< [2 nside]
};

/// Computes the ring weights that integrate zonal harmonics up to lmax (HEALPix C++, conjugate gradients).
///
/// A map limited to l1 analysed up to l2 wants lmax = l1 + l2; weights exist up to about 3 nside.
/// @param lmax     made even by rounding down
/// @param epsilon  norm of the residual over that of uniform weights at which the iteration ends; 1e-6 puts
/// the weights
///                 within 1e-8. Seconds on one core: 0.05 at nside 512, 1 at 2048, 20 at 8192
/// @throws NumericError when the iteration does not get there
[[nodiscard]] RingWeights make_ring_weights(int nside, int lmax, double epsilon = 1e-6);

}  // namespace foreglow
