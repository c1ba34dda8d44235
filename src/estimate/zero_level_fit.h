// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <span>
#include <vector>

#include "estimate/smoothed_survey.h"
#include "math/least_squares.h"
#include "sphere/grid.h"

namespace foreglow {

/// Zero levels that the surveys still had, and how well they are known.
struct ZeroLevelFit {
    std::vector<double> levels;  ///< K_RJ, to be subtracted, [surveys]
    Matrix covariance;           ///< K_RJ^2, [surveys][surveys]
    int iterations = 0;
    bool converged = true;
};

/// Returns the covariance of zero levels that nobody fitted: the stated errors, independent of each other.
[[nodiscard]] Matrix stated_zero_level_covariance(std::span<const SmoothedSurvey> surveys);

/// Fits the zero levels of all surveys to their T-T lines, one line for each cell and pair of neighbouring
/// frequencies.
///
/// Within a cell T_y - z_y = a (T_x - z_x): a single index, whose value is free. Minimised over all a and z
/// is
///   sum over cells and pairs of n_eff/s [(ybar - z_y - a (xbar - z_x))^2 + Syy - 2 a Sxy + a^2 Sxx]/(var y +
///   a^2 var x)
///   + sum over surveys of z^2/error^2,
/// the stated zero levels being the prior (a survey without zero_level_error keeps its own). n_eff counts
/// independent samples of the smoothed noise; s, at least 1, is what a cell scatters beyond its noise. Cells
/// of different index fix both levels, one index alone only z_y - a z_x (the idea of Wehus et al. 2017, A&A
/// 597, A131). An index that changes within a cell is not modelled.
[[nodiscard]] ZeroLevelFit fit_zero_levels(const HealpixGrid& grid, std::span<const SmoothedSurvey> surveys,
                                           int cell_nside);

}  // namespace foreglow
