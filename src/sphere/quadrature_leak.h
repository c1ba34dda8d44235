// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <span>
#include <vector>

namespace foreglow {

/// Returns the spectrum [lmax + 1] of the error that one ring-weighted analysis leaves, as random skies of a
/// spectrum leave it: C_l(error) = sum over bands of l' of leak(l/nside, l'/nside) C_l'.
///
/// The leak (tests/oracle/quadrature_leak.py) was measured on Gaussian skies at nside 64 in bands of nside/4,
/// against twelve refinements, for l up to 2 nside and l' up to 4 nside. As pixels and bands scale together
/// it is much the same at other nside: up to ten times larger in power at nside 32 for small l', and of finer
/// grids rather smaller. A real sky is not isotropic: allow leak_allowance.
/// @param cl           of the map, [lmax + 1]; spin 2: EE + BB
/// @param power_above  sum over l > lmax of (2 l + 1) C_l, taken to lie where it does most harm
/// @param spin         0 or 2
/// @throws ContractError where lmax exceeds 2 nside
[[nodiscard]] std::vector<double> predict_leak(std::span<const double> cl, double power_above, int nside,
                                               int spin);

/// What a prediction of rms is multiplied with before it is relied upon: seven kinds of sky with a bright
/// plane, steps and rough textures stay within it (tests/unit/sphere/quadrature_leak_test.cpp).
inline constexpr double leak_allowance = 3.0;

}  // namespace foreglow
