// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <array>

#include "base/quantity.h"

namespace foreglow {

/// Five frequencies evenly spaced in ln nu, from whose brightnesses index and curvature in the middle follow.
///
/// Central differences of fourth order (Abramowitz & Stegun 25.3): (8 (y3 - y1) - (y4 - y0))/(12 h) and (16
/// (y3 + y1) - (y4 + y0) - 30 y2)/(12 h^2); the errors are h^4/30 and h^4/90 of the fifth and the sixth
/// derivative.
class SpectralStencil {
  public:
    static constexpr std::size_t count = 5;

    SpectralStencil(Frequency middle, double step) : middle_(middle), step_(step) {}

    /// Returns the frequency of point k, 0 to 4; the middle is exact.
    [[nodiscard]] Frequency frequency(std::size_t k) const;
    /// Returns d ln T/d ln nu.
    /// @param log_t  ln T at the five
    [[nodiscard]] double index(const std::array<double, count>& log_t) const {
        return (8 * (log_t[3] - log_t[1]) - (log_t[4] - log_t[0])) / (12 * step_);
    }
    /// Returns half the second derivative.
    [[nodiscard]] double curvature(const std::array<double, count>& log_t) const {
        const double second = 16 * (log_t[3] + log_t[1]) - (log_t[4] + log_t[0]) - 30 * log_t[2];
        return 0.5 * second / (12 * step_ * step_);
    }

  private:
    Frequency middle_;
    double step_;
};

}  // namespace foreglow
