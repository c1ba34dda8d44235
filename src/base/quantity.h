// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <compare>
#include <string>
#include <string_view>

namespace foreglow {

/// Holds a frequency; a bare double never stands for one in a public function.
class Frequency {
  public:
    constexpr Frequency() = default;
    [[nodiscard]] static constexpr Frequency from_hz(double hz) { return Frequency(hz); }
    [[nodiscard]] static constexpr Frequency from_ghz(double ghz) { return Frequency(ghz * 1e9); }
    [[nodiscard]] constexpr double hz() const { return hz_; }
    [[nodiscard]] constexpr double ghz() const { return hz_ * 1e-9; }
    auto operator<=>(const Frequency&) const = default;

  private:
    explicit constexpr Frequency(double hz) : hz_(hz) {}
    double hz_ = 0;
};

/// Holds an angle.
class Angle {
  public:
    constexpr Angle() = default;
    [[nodiscard]] static constexpr Angle from_radians(double rad) { return Angle(rad); }
    [[nodiscard]] static constexpr Angle from_degrees(double deg) { return Angle(deg * degree_); }
    [[nodiscard]] constexpr double radians() const { return rad_; }
    [[nodiscard]] constexpr double degrees() const { return rad_ / degree_; }
    [[nodiscard]] constexpr double arcmin() const { return rad_ / degree_ * 60.0; }
    auto operator<=>(const Angle&) const = default;

  private:
    static constexpr double degree_ = 3.141592653589793238462643383279502884 / 180.0;
    explicit constexpr Angle(double rad) : rad_(rad) {}
    double rad_ = 0;
};

/// Splits "30 GHz" into a finite number and its unit ("" where none is written); the blank between them is
/// optional.
/// @throws InputError with a message to be put behind the name of the key
struct NumberWithUnit {
    double value = 0;
    std::string unit;
};
[[nodiscard]] NumberWithUnit parse_number_with_unit(std::string_view text);

/// Reads a positive frequency: Hz, kHz, MHz, GHz or THz.
/// @throws InputError where the number, the unit or the sign is wrong; the message does not name the key
[[nodiscard]] Frequency parse_frequency(std::string_view text);

/// Reads an angle: deg, arcmin, arcsec or rad.
/// @throws InputError where the number or the unit is wrong; the message does not name the key
[[nodiscard]] Angle parse_angle(std::string_view text);

/// Reads an energy above 0 in GeV: eV, keV, MeV, GeV or TeV.
/// @throws InputError where number, unit or range is wrong, as the two below; the message does not name the
/// key
[[nodiscard]] double parse_energy_gev(std::string_view text);
/// Reads a magnetic field above 0 in microgauss: nG, uG, mG, G, nT or T.
[[nodiscard]] double parse_field_ug(std::string_view text);
/// Reads a time of 0 or more in Myr: yr, kyr, Myr or Gyr.
[[nodiscard]] double parse_time_myr(std::string_view text);

/// Writes a frequency as a person would: "70 GHz", "408 MHz".
[[nodiscard]] std::string to_text(Frequency frequency);

/// Writes an angle as a person would: "1.5 deg", "33 arcmin".
[[nodiscard]] std::string to_text(Angle angle);

}  // namespace foreglow
