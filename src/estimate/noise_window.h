// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <span>
#include <vector>

namespace foreglow {

/// Returns the variance that a smoothing leaves of white noise of variance 1 per steradian: the integral of
/// the squared kernel, sum over l of (2 l + 1) B_l^2 / 4 pi [1/sr].
///
/// Noise of rms s per pixel of area Omega has variance s^2 Omega times this afterwards.
/// @param window  B_l of the smoothing, 0 beyond its end
[[nodiscard]] double squared_kernel_integral(std::span<const double> window);

/// Returns the window W_l of the squared kernel: a map of s^2 Omega has, smoothed with it, the variance of
/// the smoothed noise.
///
/// W_l = 2 pi integral of K(x)^2 P_l(x) dx, K(x) = sum over l of (2 l + 1) B_l P_l(x)/4 pi; W_0 is
/// squared_kernel_integral. By Gauss-Legendre panels in the angle, relative error below 1e-10 of W_0.
/// @param lmax  of the result
[[nodiscard]] std::vector<double> make_squared_window(std::span<const double> window, int lmax);

}  // namespace foreglow
