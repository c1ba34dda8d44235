// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <optional>

#include "base/quantity.h"
#include "sphere/frame.h"

namespace foreglow {

/// A point of a picture's plane: x to the right, y up.
struct PlanePoint {
    double x = 0, y = 0;
};

/// Mollweide's equal-area projection of the whole sky onto the ellipse |x| <= 2, |y| <= 1, longitude growing
/// to the LEFT.
///
/// 2 t + sin 2 t = pi sin(lat), x = -(2 / pi) (lon - lon0) cos t, y = sin t (Snyder 1987, eqs 31-1 to 31-4,
/// scaled).
class Mollweide {
  public:
    /// @param center_longitude  in the middle of the picture
    explicit Mollweide(Angle center_longitude = {}) : center_longitude_(center_longitude) {}

    /// Returns the unit vector shown at a point; nothing outside the ellipse.
    [[nodiscard]] std::optional<Vector3> direction_at(double x, double y) const;
    /// Returns where a direction is shown (need not be normalised).
    [[nodiscard]] PlanePoint position_of(const Vector3& direction) const;

  private:
    Angle center_longitude_;
};

/// The gnomonic (tangent-plane) projection, x and y in units of the sphere's radius, north up and longitude
/// to the LEFT.
///
/// With xi, eta the standard coordinates (east, north): x = -xi, y = eta (Snyder 1987, eqs 22-4 and 22-5).
class Gnomonic {
  public:
    /// @param longitude, latitude  of the tangent point; latitude from -90 to 90 deg
    /// @throws ContractError where the latitude is outside
    Gnomonic(Angle longitude, Angle latitude);

    /// Returns the unit vector shown at a point; each point of the plane shows one.
    [[nodiscard]] std::optional<Vector3> direction_at(double x, double y) const;
    /// Returns where a direction is shown; nothing when it is 90 deg or more from the tangent point.
    [[nodiscard]] std::optional<PlanePoint> position_of(const Vector3& direction) const;

  private:
    Vector3 center_{}, east_{}, north_{};
};

/// Returns the unit vector at a longitude and latitude.
[[nodiscard]] Vector3 direction_of(Angle longitude, Angle latitude);

/// Returns the longitude, from 0 up to 360 deg, of a direction (need not be normalised; 0 at the poles).
[[nodiscard]] Angle longitude_of(const Vector3& direction);

/// Returns the latitude of a direction (need not be normalised), accurate also near the poles.
[[nodiscard]] Angle latitude_of(const Vector3& direction);

}  // namespace foreglow
