// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <vector>

namespace foreglow {

/// Nodes in (-1, 1), ascending, and weights that sum to 2; [points] each.
struct QuadratureRule {
    std::vector<double> nodes;
    std::vector<double> weights;
};

/// Makes the Gauss-Legendre rule with 1 to 256 points, exact for polynomials of degree 2 points - 1.
///
/// Newton iteration on P_n from the asymptotic zeros (Abramowitz & Stegun 1964, 25.4.30). Error of nodes and
/// weights below 4e-16.
[[nodiscard]] QuadratureRule make_gauss_legendre(int points);

}  // namespace foreglow
