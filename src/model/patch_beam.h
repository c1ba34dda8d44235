// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <span>

#include "base/quantity.h"
#include "math/fft.h"
#include "model/channel.h"

namespace foreglow {

/// Smooths flat images of one size with a channel's beam: exp(-k^2 sigma^2/2), or a table at l = |k| - 1/2
/// that ends where it ends.
///
/// Beyond its edges an image is taken to repeat its nearest pixels, so a margin of five sigma is wanted.
class PatchBeam {
  public:
    /// @param pixels  a side
    PatchBeam(int pixels, Angle pixel);

    /// @param image  [pixels][pixels], all defined, changed in place
    void apply(const Channel& channel, std::span<double> image) const;

  private:
    int pixels_;
    PlaneFourier plane_;
    double side_;  // of a pixel [rad]
};

}  // namespace foreglow
