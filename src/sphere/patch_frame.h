// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <span>
#include <vector>

#include "base/quantity.h"
#include "sphere/frame.h"

namespace foreglow {

/// A square of pixels on the plane that touches the sky at its centre (gnomonic, WCS 'TAN': Calabretta &
/// Greisen 2002), north up, longitude growing to the left.
///
/// Pixel (i, j), i from the left and j from below, lies at x = (i - (n - 1)/2) d to the right and y = (j - (n
/// - 1)/2) d upwards in units of the sphere's radius, d the pixel's side at the centre. Buffers are [n][n], i
/// running fastest. At an angle t from the centre the scale is 1/cos^2 t along and 1/cos t across the radius.
class PatchFrame {
  public:
    /// @param longitude, latitude  of the centre, in any frame; latitude from -90 to 90 deg
    PatchFrame(Angle longitude, Angle latitude, Angle pixel, int pixels);

    [[nodiscard]] int pixels() const { return pixels_; }
    [[nodiscard]] Angle pixel() const { return pixel_; }
    [[nodiscard]] Angle longitude() const { return longitude_; }
    [[nodiscard]] Angle latitude() const { return latitude_; }
    /// Returns the same patch with a margin on each side.
    [[nodiscard]] PatchFrame with_margin(int margin) const;
    /// Returns the unit vectors of the pixels' centres, [n][n].
    [[nodiscard]] std::vector<Vector3> directions() const;
    /// Returns the angle psi from each pixel's local south to the centre's south carried there along the
    /// great circle, positive towards east [rad], where local means the meridian of a frame turned from the
    /// patch's own by a rotation: (Q + iU) against the carried axes = (Q + iU) local e^{-2 i psi} (COSMO).
    /// @param rotation  takes vectors of the patch's frame to the other one
    [[nodiscard]] std::vector<double> turns(const Matrix3& rotation) const;

  private:
    Angle longitude_, latitude_, pixel_;
    int pixels_;
};

}  // namespace foreglow
