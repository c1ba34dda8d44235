// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <span>
#include <vector>

namespace foreglow {

/// What a smooth fit across channels is made of; all [channels].
struct FloorSetup {
    std::vector<double> log_ratios;  ///< x_c = ln(nu_c/nu_ref)
    std::vector<double> responses;   ///< R_c, above 0: a channel's number for the reference power law
    std::vector<double> noise;       ///< sigma_c in the maps' unit, per pixel; empty: uniform weights
    bool in_log = true;              ///< ln y is fitted, else y itself
    int terms = 1;                   ///< K, below the number of channels
};

/// What became of the pixels.
struct FloorCounts {
    std::int64_t fitted = 0;
    std::int64_t undefined = 0;     ///< in one of the channels
    std::int64_t not_positive = 0;  ///< y <= 0 in one of the channels, where ln y is fitted
};

/// Writes what the best smooth fit leaves of channel maps: the floor of a subtraction that knows no more than
/// smoothness.
///
/// y_c = M_c/R_c; ln y (or y) = sum over j < K of a_j x^j by least squares with weights 1/sigma^2: sigma_y =
/// sigma_c/R_c, for ln y sigma_y/y; uniform without noise. The residual is (y - fit) R_c. Orthonormal
/// polynomials (Stieltjes, each orthogonalised twice) keep it within 1e-12 of y for any K that data can tell
/// apart. With threads.
/// @param maps       [channels][npix], NaN where undefined
/// @param residuals  [channels][npix]; NaN where there is no fit
FloorCounts make_floor_residuals(const FloorSetup& setup, std::span<const std::vector<double>> maps,
                                 std::span<std::vector<double>> residuals);

/// Fits one pixel: writes what remains of `values` after K terms.
/// @param weights  [channels], 1/variance of each value in any common unit
/// @param values   [channels], replaced by the residual
void subtract_smooth_fit(std::span<const double> log_ratios, std::span<const double> weights, int terms,
                         std::span<double> values);

}  // namespace foreglow
