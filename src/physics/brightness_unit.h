// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <optional>
#include <string>
#include <string_view>

#include "base/quantity.h"

namespace foreglow {

/// The units of maps: the kind and a scale in front of it (1e-6 for uK_CMB).
struct BrightnessUnit {
    enum class Kind { RayleighJeans, Thermodynamic, MegajanskyPerSteradian, JanskyPerPixel };
    Kind kind = Kind::RayleighJeans;
    double scale = 1.0;  ///< one unit in units of K_RJ, K_CMB, MJy/sr or Jy/pixel

    bool operator==(const BrightnessUnit&) const = default;
};

/// Reads K_RJ, mK_RJ, uK_RJ, K_CMB, mK_CMB, uK_CMB, MJy/sr or Jy/pixel (exactly so, but for blanks around).
/// @return nothing where the text is no such unit; a bare K, mK or uK is none: it does not say which
[[nodiscard]] std::optional<BrightnessUnit> find_brightness_unit(std::string_view text);

/// Returns the text of a unit as it stands in study files and TUNIT cards: "uK_CMB".
[[nodiscard]] std::string to_text(const BrightnessUnit& unit);

/// Returns the units' names, for messages: "K_RJ, mK_RJ, ...".
[[nodiscard]] std::string list_of_brightness_units();

/// Returns d(K_CMB)/d(K_RJ)^-1, the Rayleigh-Jeans temperature of 1 K_CMB: x^2 e^x/(e^x - 1)^2, x = h nu/(k
/// T_CMB).
///
/// The linearised unit at T_CMB = 2.7255 K (Planck 2013 IX, eq. 8). Relative error below 1e-14 from 1 Hz to
/// 10 THz.
[[nodiscard]] double rayleigh_jeans_per_thermodynamic(Frequency frequency);

/// Returns the K_RJ of one unit at one frequency: T_RJ = c^2 I/(2 k nu^2); Jy/pixel needs the pixel's area
/// [sr].
[[nodiscard]] double rayleigh_jeans_per_unit(const BrightnessUnit& unit, Frequency frequency,
                                             double pixel_area_sr);

/// A brightness such as "8.9 K_RJ".
struct Brightness {
    double value = 0;
    BrightnessUnit unit;
};
/// @throws InputError where the number or the unit is wrong; the message does not name the key
[[nodiscard]] Brightness parse_brightness(std::string_view text);

}  // namespace foreglow
