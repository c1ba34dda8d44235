// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <optional>
#include <span>
#include <vector>

#include "base/quantity.h"
#include "sphere/alm.h"
#include "sphere/beam.h"
#include "sphere/frame.h"
#include "sphere/grid.h"
#include "sphere/harmonics.h"

namespace foreglow {

/// Tells for each pixel which share of a beam's weight falls on pixels that were filled because a survey had
/// no value there.
///
/// The map of 0 and 1 is taken to a finer grid first (up to 4 times finer), so that its edges do not ring,
/// and smoothed with a Gaussian as wide as the beam, at least one pixel. Accurate to about 2e-3 near the
/// threshold of 1 %, to 1e-2 where most of the beam falls on filled pixels.
class FilledShare {
  public:
    /// @param values     [npix]; NaN marks the filled pixels
    /// @param narrowest  FWHM of the narrowest beam that will be asked for
    FilledShare(const HealpixGrid& grid, Frame frame, std::span<const double> values, Angle narrowest);

    [[nodiscard]] bool any() const { return alm_.has_value(); }
    /// Returns the shares on the same grid, in another frame if wanted, [npix].
    [[nodiscard]] std::vector<double> under_beam(Angle fwhm, Frame frame) const;

    /// Returns the shares on one strip, [pixel_count(grid, strip)].
    [[nodiscard]] std::vector<double> on_strip(Angle fwhm, Frame frame, const RingStrip& strip) const;

  private:
    [[nodiscard]] Alm smoothed(Angle fwhm, Frame frame) const;

    HealpixGrid grid_;
    Frame frame_;
    std::optional<Alm> alm_;
};

/// Returns the FWHM of the Gaussian whose window is 1/2 where that of a beam is; at least the side of a
/// pixel.
[[nodiscard]] Angle equivalent_fwhm(const BeamWindow& window, const HealpixGrid& grid);

}  // namespace foreglow
