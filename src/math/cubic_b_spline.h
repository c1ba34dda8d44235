// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <array>
#include <cstddef>
#include <span>

#include "base/vector_width.h"

namespace foreglow {

/// Turns values at evenly spaced points into the coefficients of the cubic B-spline through them, with zero
/// second derivative at both ends (de Boor 1978, ch. XIII): (c_{i-1} + 4 c_i + c_{i+1})/6 = value_i.
///
/// What the ends spoil falls by 0.27 from point to point. In place.
/// @param values  [n stride]: point i of column j at values[i stride + j], n >= 3
/// @param stride  columns, which are independent of one another
void make_b_spline_coefficients(std::span<double> values, std::size_t stride);

/// The weights of the four coefficients i - 1 .. i + 2 at a place a fraction u in [0, 1) beyond point i, and
/// those of the first derivative per step.
struct BSplineWeights {
    std::array<double, 4> value{}, slope{};
};
[[nodiscard]] FOREGLOW_INLINE BSplineWeights b_spline_weights(double u) {
    const double v = 1 - u;
    const double u2 = u * u;
    const double v2 = v * v;
    return {{v2 * v / 6, (4 - 3 * u2 * (1 + v)) / 6, (4 - 3 * v2 * (1 + u)) / 6, u2 * u / 6},
            {-0.5 * v2, 0.5 * u * (3 * u - 4), -0.5 * v * (3 * v - 4), 0.5 * u2}};
}

}  // namespace foreglow
