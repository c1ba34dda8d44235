// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <span>
#include <vector>

#include "base/quantity.h"
#include "estimate/smoothed_survey.h"
#include "sphere/grid.h"

namespace foreglow {

/// Sums over the pixels of a cell that two surveys share: what a straight line through them needs.
struct PairMoments {
    double pixels = 0;
    double x = 0, y = 0, xx = 0, xy = 0, yy = 0;  ///< sums [K_RJ, K_RJ^2]
    double x_variance = 0, y_variance = 0;        ///< sums of the noise variances [K_RJ^2]

    void add(const PairMoments& other, double sign = 1);
    [[nodiscard]] double mean_x() const { return x / pixels; }
    [[nodiscard]] double mean_y() const { return y / pixels; }
    [[nodiscard]] double variance_x() const;  ///< of the values about their mean
    [[nodiscard]] double variance_y() const;
    [[nodiscard]] double covariance() const;
};

/// A straight line y = slope x + intercept; NaN where the moments give none.
struct Line {
    double slope = 0, intercept = 0;
};

/// Returns the line for errors on both axes whose variances have the ratio d = <var y>/<var x>:
/// slope = (Syy - d Sxx + sqrt((Syy - d Sxx)^2 + 4 d Sxy^2))/(2 Sxy) (Deming 1943, "Statistical adjustment of
/// data"); where neither survey has noise, the symmetric sign(Sxy) sqrt(Syy/Sxx). No x: the plain regression
/// of y on x.
[[nodiscard]] Line fit_line(const PairMoments& moments);

/// The T-T estimate of one pair in one cell.
struct ScatterCell {
    int nside = 0;                  ///< of the cell; 0: all of the sky that both have
    std::int64_t pixel = -1;        ///< RING number
    std::size_t low = 0, high = 0;  ///< numbers of the surveys: x and y
    std::int64_t pixels = 0;
    double correlation = 0;
    double slope = 0, slope_error = 0;          ///< T_high = slope T_low + intercept
    double intercept = 0, intercept_error = 0;  ///< K_RJ
    double index = 0, index_error = 0;  ///< ln slope/ln(nu_high/nu_low); NaN where the slope is not positive
    double index_forward = 0;           ///< of the regression of y on x: all the noise in y
    double index_reverse = 0;           ///< of x on y
};

/// Makes the T-T estimate of each pair of surveys: of all the sky first, then cell by cell.
///
/// Zero levels drop out. Errors by the jackknife over 16 blocks of the cell (of all the sky: over the cells),
/// so that noise which the smoothing has correlated counts as it should; calibration errors are added to the
/// index's, (g_x^2 + g_y^2)/ln(nu_y/nu_x)^2, where common_errors. A cell needs 10 pixels and 3 blocks.
/// @param cell_nside  at most the surveys'
[[nodiscard]] std::vector<ScatterCell> make_scatter_cells(const HealpixGrid& grid,
                                                          std::span<const SmoothedSurvey> surveys,
                                                          int cell_nside, bool common_errors);

/// Sums the moments of a pair over blocks: the children of each cell, [cells][blocks], nested order.
struct CellBlocks {
    HealpixGrid cells{1};
    std::size_t per_cell = 1;
    std::vector<PairMoments> blocks;

    [[nodiscard]] std::span<const PairMoments> of_cell(std::size_t nested) const {
        return std::span(blocks).subspan(nested * per_cell, per_cell);
    }
};
[[nodiscard]] CellBlocks make_cell_blocks(const HealpixGrid& grid, const SmoothedSurvey& low,
                                          const SmoothedSurvey& high, int cell_nside);

}  // namespace foreglow
