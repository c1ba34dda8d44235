// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <span>

#include "base/random.h"
#include "sphere/alm.h"

namespace foreglow {

/// Draws the a_lm of a Gaussian random field with a given spectrum; each is a pure function of (key, l, m).
///
/// m = 0: real, N(0, C_l); m > 0: real and imaginary part N(0, C_l / 2). The same coefficients whatever lmax,
/// so a finer map has the same large-scale modes.
/// @param cl  [l], l = 0.. ; none negative; beyond its end the field is zero
/// @throws ContractError where a C_l is negative or not finite
[[nodiscard]] Alm make_gaussian_alm(std::span<const double> cl, int lmax, const RandomKey& key);

}  // namespace foreglow
