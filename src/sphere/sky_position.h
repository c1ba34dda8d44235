// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <string_view>

#include "sphere/frame.h"

namespace foreglow {

/// A place on the sky in some frame.
struct SkyPosition {
    double lon_deg = 0;  ///< in [0, 360)
    double lat_deg = 0;  ///< in [-90, 90]
};

/// Returns a position with its longitude brought into [0, 360).
/// @throws InputError where the longitude is outside [-360, 360] or the latitude outside [-90, 90]; the
/// message does not say where it was given
[[nodiscard]] SkyPosition make_position(double lon_deg, double lat_deg);

/// Reads "LON,LAT": degrees in any frame; in icrs also hours and degrees, "05:34:31.9,+22:00:52".
/// @throws InputError where a number is wrong or out of range; the message does not say where it was given
[[nodiscard]] SkyPosition parse_position(std::string_view lon, std::string_view lat, Frame frame);

/// Returns the unit vector of a position.
[[nodiscard]] Vector3 direction_of(const SkyPosition& position);

/// Returns the position of a direction (need not be normalised).
[[nodiscard]] SkyPosition position_of(const Vector3& direction);

}  // namespace foreglow
