// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/projection.h"

#include <algorithm>
#include <cmath>

#include "base/constants.h"
#include "base/error.h"

namespace foreglow {
namespace {

using constants::pi;

double dot(const Vector3& a, const Vector3& b) {
    return a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
}

/// Solves 2 t + sin 2 t = pi sin(lat) for t in [0, pi/2], lat >= 0.
double auxiliary_angle(double sin_latitude, double cos_latitude) {
    if (cos_latitude == 0) return pi / 2;
    // With d = pi/2 - t the equation is 2 d - sin 2 d = pi (1 - sin lat), whose right side keeps its digits
    // near the pole.
    const double right = pi * cos_latitude * cos_latitude / (1.0 + sin_latitude);
    // The left side is (2 d)^3 / 6 (1 - ...): convex, so Newton from an overestimate comes down without
    // overshoot.
    double d = std::min(pi / 2, 0.75 * std::cbrt(6.0 * right));
    for (int step = 0; step < 50; ++step) {
        const double value =
            2.0 * d < 0.1
                ? std::pow(2.0 * d, 3) / 6.0 *
                      (1.0 - std::pow(2.0 * d, 2) / 20.0 *
                                 (1.0 - std::pow(2.0 * d, 2) / 42.0 * (1.0 - std::pow(2.0 * d, 2) / 72.0)))
                : 2.0 * d - std::sin(2.0 * d);
        const double slope = 4.0 * std::sin(d) * std::sin(d);
        const double change = (value - right) / slope;
        d -= change;
        if (std::abs(change) <= 1e-15 * d) break;
    }
    return pi / 2 - d;
}

}  // namespace

std::optional<Vector3> Mollweide::direction_at(double x, double y) const {
    const double squared = 0.25 * x * x + y * y;
    if (!(squared <= 1.0)) return std::nullopt;
    const double t = std::asin(y), cos_t = std::sqrt((1.0 - y) * (1.0 + y));
    const double sin_latitude = (2.0 * t + std::sin(2.0 * t)) / pi;
    const double offset = cos_t > 0 ? -0.5 * pi * x / cos_t : 0.0;
    const double longitude = center_longitude_.radians() + offset;
    const double cos_latitude = std::sqrt(std::max(0.0, (1.0 - sin_latitude) * (1.0 + sin_latitude)));
    return Vector3{cos_latitude * std::cos(longitude), cos_latitude * std::sin(longitude), sin_latitude};
}

PlanePoint Mollweide::position_of(const Vector3& direction) const {
    const double rho = std::hypot(direction[0], direction[1]), length = std::hypot(rho, direction[2]);
    FOREGLOW_EXPECTS(length > 0);
    const double t =
        std::copysign(auxiliary_angle(std::abs(direction[2]) / length, rho / length), direction[2]);
    const double offset =
        std::remainder(std::atan2(direction[1], direction[0]) - center_longitude_.radians(), 2.0 * pi);
    return {-2.0 / pi * offset * std::cos(t), std::sin(t)};
}

Gnomonic::Gnomonic(Angle longitude, Angle latitude) {
    FOREGLOW_EXPECTS(std::abs(latitude.degrees()) <= 90.0 * (1.0 + 1e-14));
    const double cl = std::cos(longitude.radians()), sl = std::sin(longitude.radians());
    const double cb = std::cos(latitude.radians()), sb = std::sin(latitude.radians());
    center_ = {cb * cl, cb * sl, sb};
    east_ = {-sl, cl, 0.0};
    north_ = {-sb * cl, -sb * sl, cb};
}

std::optional<Vector3> Gnomonic::direction_at(double x, double y) const {
    const double length = std::sqrt(1.0 + x * x + y * y);
    Vector3 out{};
    for (std::size_t i = 0; i < 3; ++i)
        out[i] = (center_[i] - x * east_[i] + y * north_[i]) / length;
    return out;
}

std::optional<PlanePoint> Gnomonic::position_of(const Vector3& direction) const {
    const double depth = dot(direction, center_);
    if (!(depth > 0)) return std::nullopt;
    return PlanePoint{-dot(direction, east_) / depth, dot(direction, north_) / depth};
}

Vector3 direction_of(Angle longitude, Angle latitude) {
    const double cb = std::cos(latitude.radians());
    return {cb * std::cos(longitude.radians()), cb * std::sin(longitude.radians()),
            std::sin(latitude.radians())};
}

Angle longitude_of(const Vector3& direction) {
    const double phi = std::atan2(direction[1], direction[0]);
    const double wrapped = phi < 0 ? phi + 2.0 * pi : phi;
    return Angle::from_radians(wrapped < 2.0 * pi ? wrapped : 0.0);
}

Angle latitude_of(const Vector3& direction) {
    return Angle::from_radians(std::atan2(direction[2], std::hypot(direction[0], direction[1])));
}

}  // namespace foreglow
