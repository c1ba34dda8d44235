// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <array>
#include <string>

namespace foreglow {

using Vector3 = std::array<double, 3>;
using Matrix3 = std::array<std::array<double, 3>, 3>;

/// The celestial frames of the interface: COORDSYS G, C and E.
enum class Frame { Galactic, Icrs, Ecliptic };

/// Returns the COORDSYS letter: 'G', 'C' or 'E'.
[[nodiscard]] char coordsys_letter(Frame frame);

/// Returns the name used in study files: "galactic", "icrs" or "ecliptic".
[[nodiscard]] std::string to_text(Frame frame);

/// Returns the rotation that takes unit vectors of one frame to another: v_to = R v_from.
///
/// ICRS to galactic: the matrix of the Hipparcos catalogue (ESA 1997, vol. 1, eq. 1.5.11), pole
/// (192.85948, 27.12825) deg and node 32.93192 deg. ICRS to ecliptic: mean obliquity of J2000.0, 23.4392911
/// deg (IAU 1976).
[[nodiscard]] Matrix3 rotation_between(Frame from, Frame to);

[[nodiscard]] Vector3 rotate(const Matrix3& rotation, const Vector3& v);

}  // namespace foreglow
