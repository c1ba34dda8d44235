// SPDX-License-Identifier: GPL-2.0-or-later
#include "math/gauss_legendre.h"

#include <cmath>

#include "base/constants.h"
#include "base/error.h"

namespace foreglow {
namespace {

struct Legendre {
    double value = 0, derivative = 0;
};

Legendre legendre(int n, double x) {
    double previous = 1.0;
    double current = x;
    for (int k = 2; k <= n; ++k) {
        const double next = ((2 * k - 1) * x * current - (k - 1) * previous) / k;
        previous = current;
        current = next;
    }
    return {current, n * (x * current - previous) / (x * x - 1.0)};
}

}  // namespace

QuadratureRule make_gauss_legendre(int points) {
    FOREGLOW_EXPECTS(points >= 1 && points <= 256);
    QuadratureRule rule;
    rule.nodes.assign(static_cast<std::size_t>(points), 0.0);
    rule.weights.assign(static_cast<std::size_t>(points), 2.0);
    if (points == 1) return rule;
    for (int i = 0; i < (points + 1) / 2; ++i) {
        double x = std::cos(constants::pi * (i + 0.75) / (points + 0.5));
        for (int round = 0; round < 8; ++round) {
            const Legendre p = legendre(points, x);
            const double step = p.value / p.derivative;
            x -= step;
            if (std::abs(step) < 1e-16) break;
        }
        if (2 * i + 1 == points) x = 0.0;
        const double slope = legendre(points, x).derivative;
        const double weight = 2.0 / ((1.0 - x * x) * slope * slope);
        const auto low = static_cast<std::size_t>(i);
        const auto high = static_cast<std::size_t>(points - 1 - i);
        rule.nodes[low] = -x;
        rule.nodes[high] = x;
        rule.weights[low] = rule.weights[high] = weight;
    }
    return rule;
}

}  // namespace foreglow
