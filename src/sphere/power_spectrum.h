// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <span>
#include <vector>

#include "sphere/alm.h"

namespace foreglow {

/// Returns the power spectrum C_l = sum over m = -l..l of |a_lm|^2 / (2 l + 1), [lmax + 1].
[[nodiscard]] std::vector<double> power_spectrum(const Alm& alm);

/// Returns the cross spectrum C_l = sum over m = -l..l of Re(a_lm conj(b_lm)) / (2 l + 1), up to the smaller
/// lmax.
[[nodiscard]] std::vector<double> cross_spectrum(const Alm& a, const Alm& b);

/// Returns the rms on the sky that a spectrum stands for: sqrt(sum over l >= first_l of (2 l + 1) C_l B_l^2 /
/// 4 pi).
/// @param window   B_l [l]; l beyond its end count nothing; empty stands for 1
/// @param first_l  2 leaves monopole and dipole out
[[nodiscard]] double rms_of_spectrum(std::span<const double> cl, std::span<const double> window = {},
                                     int first_l = 2);

/// Returns the largest ratio, over some windows, of the rms (l >= 2) of an error's spectrum to that of the
/// map's; 0 for a map without power.
/// @param windows  [beams][l]; none: one that is 1 at all l
[[nodiscard]] double relative_rms(std::span<const double> error_cl, std::span<const double> map_cl,
                                  std::span<const std::vector<double>> windows);

}  // namespace foreglow
