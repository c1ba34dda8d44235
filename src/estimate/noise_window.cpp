// SPDX-License-Identifier: GPL-2.0-or-later
#include "estimate/noise_window.h"

#include <cmath>

#include "base/constants.h"
#include "base/error.h"
#include "math/gauss_legendre.h"

namespace foreglow {
namespace {

/// Steps through P_0, P_1, ... at one x by the three-term recurrence.
class LegendreSteps {
  public:
    explicit LegendreSteps(double x) : x_(x) {}
    [[nodiscard]] double value() const { return now_; }
    void step() {
        const double l = ++degree_;
        const double next = ((2 * l - 1) * x_ * now_ - (l - 1) * before_) / l;
        before_ = now_;
        now_ = next;
    }

  private:
    double x_, degree_ = 0, now_ = 1, before_ = 0;
};

double kernel_at(std::span<const double> window, double x) {
    LegendreSteps steps(x);
    double sum = 0;
    for (std::size_t l = 0; l < window.size(); ++l, steps.step())
        sum += (2 * static_cast<double>(l) + 1) * window[l] * steps.value();
    return sum / (4 * constants::pi);
}

}  // namespace

double squared_kernel_integral(std::span<const double> window) {
    double sum = 0;
    for (std::size_t l = 0; l < window.size(); ++l)
        sum += (2 * static_cast<double>(l) + 1) * window[l] * window[l];
    return sum / (4 * constants::pi);
}

std::vector<double> make_squared_window(std::span<const double> window, int lmax) {
    FOREGLOW_EXPECTS(lmax >= 0 && !window.empty());
    constexpr int panel_points = 32;
    // The integrand has up to (2 lmax_B + lmax)/2 periods from pole to pole; a panel of 32 points bears
    // three.
    const double periods = 0.5 * static_cast<double>(2 * window.size() + static_cast<std::size_t>(lmax));
    const int panels = static_cast<int>(std::ceil(periods / 3)) + 1;
    const QuadratureRule rule = make_gauss_legendre(panel_points);
    std::vector<double> out(static_cast<std::size_t>(lmax) + 1);
    const double half = 0.5 * constants::pi / panels;
    for (int panel = 0; panel < panels; ++panel)
        for (std::size_t i = 0; i < rule.nodes.size(); ++i) {
            const double theta = half * (2 * panel + 1 + rule.nodes[i]);
            const double x = std::cos(theta);
            const double kernel = kernel_at(window, x);
            const double weight =
                2 * constants::pi * half * rule.weights[i] * std::sin(theta) * kernel * kernel;
            LegendreSteps steps(x);
            for (double& value : out) {
                value += weight * steps.value();
                steps.step();
            }
        }
    return out;
}

}  // namespace foreglow
