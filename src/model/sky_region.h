// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <span>
#include <vector>

#include "base/quantity.h"
#include "sphere/frame.h"
#include "sphere/grid.h"

namespace foreglow {

/// Returns the weights of the sky beyond a galactic latitude, with a soft edge: 0 for |b| below the cut,
/// (1 - cos(pi (|b| - cut) / 10 deg)) / 2 over the next 10 deg, 1 beyond; all 1 where the cut is 0.
/// @param frame  of the grid
/// @return       [npix]
[[nodiscard]] std::vector<double> make_latitude_weights(const HealpixGrid& grid, Frame frame,
                                                        Angle latitude_cut);

/// Sets weights to 0 where a map is undefined.
void exclude_undefined(std::span<double> weights, std::span<const double> values);

/// Sums over a sky that a masked spectrum needs.
struct RegionMoments {
    double mean_square = 0;  ///< <apo^2>
    double mean_fourth = 0;  ///< <apo^4>
    /// Returns the share of the modes of a whole sky that the region holds: <apo^2>^2 / <apo^4>.
    [[nodiscard]] double effective_fraction() const { return mean_square * mean_square / mean_fourth; }
};
[[nodiscard]] RegionMoments region_moments(std::span<const double> weights);

/// Returns <apo^2 f(value)> / <apo^2> over the pixels with weight; the sum's order is fixed.
template <class Function>
[[nodiscard]] double region_mean(std::span<const double> weights, const Function& value_at) {
    double sum = 0, total = 0;
    for (std::size_t i = 0; i < weights.size(); ++i) {
        const double w = weights[i] * weights[i];
        if (w == 0) continue;
        total += w;
        sum += w * value_at(i);
    }
    return total > 0 ? sum / total : 0.0;
}

}  // namespace foreglow
