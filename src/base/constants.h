// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

namespace foreglow::constants {

// CODATA 2018; e, c, h and k are exact in the SI of 2019 (https://physics.nist.gov/cuu/Constants/).
inline constexpr double speed_of_light = 299792458.0;            // m/s
inline constexpr double planck = 6.62607015e-34;                 // J s
inline constexpr double boltzmann = 1.380649e-23;                // J/K
inline constexpr double elementary_charge = 1.602176634e-19;     // C
inline constexpr double electron_mass = 9.1093837015e-31;        // kg
inline constexpr double vacuum_permittivity = 8.8541878128e-12;  // F/m
inline constexpr double t_cmb = 2.7255;                          // K, Fixsen 2009
inline constexpr double pi = 3.141592653589793238462643383279502884;
inline constexpr double jansky = 1e-26;  // W m^-2 Hz^-1

}  // namespace foreglow::constants
