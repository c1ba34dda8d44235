// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <span>
#include <string>
#include <vector>

namespace foreglow {

/// One spherical shell of the Galaxy's loops. The angles follow the published geometry (Berkhuijsen 1971);
/// distances, brightnesses and bright sides are invented.
struct GalaxyLoop {
    std::string name;
    double longitude = 0, latitude = 0;  ///< of the centre [deg]
    double diameter = 0;                 ///< [deg]
    double distance = 0;                 ///< of the centre [kpc]
    double thickness = 0.1;              ///< of the shell, as a fraction of its radius
    double brightness = 0;               ///< of the ridge at 408 MHz [K_RJ], were it bright all around
    double bright_angle = 0;  ///< of the bright side, from north through increasing longitude [deg]
    double faint_side = 0.2;  ///< brightness of the faint side over that of the bright one
    double contrast = 1.5;    ///< power of (1 + cos)/2 between the two
    double field = 8;         ///< that its electrons radiate in [uG]
};

/// The four shells of the bundled Galaxy.
[[nodiscard]] std::vector<GalaxyLoop> make_published_loops();

/// Parameters of the built-in 3-D Galaxy (docs/physics.md), all invented and tuned to known brightnesses.
///
/// Lengths kpc, fields uG, energies GeV, densities m^-3 GeV^-1 and cm^-3, angles deg. Radial scales stand for
/// rad(L, Rc) = exp(-(sqrt(R^2 + Rc^2) - sqrt(R0^2 + Rc^2))/L), which is 1 at the Sun.
struct GalaxySpec {
    bool disc = true, loops = true, turbulence = true;
    std::uint64_t seed = 1;           ///< of this sky itself, not of a study
    double tolerance = 1e-3;          ///< relative, of the integral along a line of sight
    double index_scatter = 0;         ///< rms of d(n) in T(nu) *= (nu/408 MHz)^d(n)
    double sun_radius = 8.2;          // R0
    double radius_limit = 22;         // Rmax
    double height_limit = 12;         // zmax
    double distance_limit = 30;       // dmax
    double turbulence_length = 0.06;  // Lturb
    std::vector<GalaxyLoop> shells = make_published_loops();

    // [galaxy.electrons]
    double density = 1.15e-8;     // N10, at 10 GeV
    double slope = 1.8;           // s1
    double slope_above = 3.42;    // s2
    double break_energy = 3.5;    // Eb
    double break_width = 0.5;     // wb
    double height = 2.6;          // h1
    double height_energy = 3;     // E1
    double height_power = 0.4;    // dh
    double radius = 19;           // Rcr
    double core = 2.5;            // Rc
    double young_share = 0.55;    // fy
    double young_slope = 2.6;     // sy
    double young_cutoff = 200;    // Ey
    double young_turnover = 2.5;  // El
    double young_turnover_power = 0.6;
    double young_height = 0.3;  // hy
    double young_radius = 4.5;  // Ryo
    double young_core = 3;
    double young_arm_contrast = 2;  // of 1 + 2 (a - 1)

    // [galaxy.field]
    double disc_field = 2.7;   // B0
    double disc_radius = 14;   // RB
    double disc_core = 2;      // RcB
    double disc_height = 0.9;  // zB
    double pitch = -11.5;      // deg
    double arm = 0.35;
    double arm_phase = 0.5 * 180 / 3.141592653589793238462643383279502884;  // phi_arm, deg
    double arm_onset = 3;
    double arm_height = 0.6;
    double disc_onset = 2;
    double reversal_radius = 6.8;  // Rrev
    double reversal_width = 0.4;   // wrev
    double halo_field = 2.6;       // Bh
    double halo_height = 1.4;      // zh
    double halo_width = 1.2;       // wz
    double halo_radius = 8;        // Rh
    double halo_onset = 0.3;
    double vertical_field = 0.25;  // Bz
    double random_field = 6.2;     // b0
    double random_radius = 28;     // Rb
    double random_core = 2.5;      // Rcb
    double random_height = 2.6;    // zb

    // [galaxy.gas], thermal electrons
    double thick_density = 0.014;  // n1
    double thick_height = 1.6;     // hn1
    double thick_radius = 10;      // Rn1
    double thick_core = 2;
    double thin_density = 0.02;  // n2
    double thin_height = 0.12;   // hn2
    double thin_radius = 5;      // Rn2
    double thin_core = 3;
};

/// One number of a GalaxySpec as a model file names it.
struct GalaxyKey {
    const char* section;  ///< "" for [galaxy] itself, else "electrons", "field" or "gas"
    const char* name;
    const char* unit;  ///< "" for a bare number
    double GalaxySpec::*member;
    double low, high;  ///< bounds, in `unit`
};

/// Returns all numbers that a model file may set, in the order in which they are documented.
[[nodiscard]] std::span<const GalaxyKey> galaxy_keys();

/// Writes every number that the Galaxy depends on, exactly and in a fixed order: what a cache's key is made
/// from.
[[nodiscard]] std::string describe_exactly(const GalaxySpec& galaxy);

}  // namespace foreglow
