// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <array>
#include <cstddef>

#include "model/galaxy_spec.h"
#include "sphere/frame.h"

namespace foreglow {

/// Rotation measure of 1 kpc with 1 electron per cm^3 in 1 uG towards the observer: e^3/(8 pi^2 eps0 m^2 c^3)
/// (Burn 1966; CODATA 2018) [rad/m^2].
inline constexpr double depth_per_kpc = 811.901164;

/// A line of sight from the Sun: its direction, where it leaves the Galaxy, and the basis of Q and U there.
struct GalaxyRay {
    /// @param direction  galactic unit vector
    GalaxyRay(const GalaxySpec& galaxy, const Vector3& direction);

    Vector3 direction, south, east;  ///< COSMO: e_theta, e_phi
    double length = 0;               ///< [kpc]
    double stretched = 0;            ///< ln(1 + length/start), the length in u; d(u) = start (e^u - 1)
    static constexpr double start = 0.3;
};

/// What the Galaxy is at the middles of some steps along a line of sight, as arrays over them.
struct GalaxySamples {
    static constexpr std::size_t capacity = 64;
    using Row = std::array<double, capacity>;

    std::size_t count = 0;
    Row step;               ///< [kpc]
    Row old_weight;         ///< B_eff times density over that at the Sun times step, of the old disc
    Row young_weight;       ///< likewise of the young disc
    Row q_share, u_share;   ///< -(Bt^2 - Bp^2)/B_eff^2 and -2 Bt Bp/B_eff^2, along south and east
    Row random_share;       ///< (2/3) b^2/B_eff^2
    Row depth, dispersion;  ///< rotation measure [rad/m^2] and its variance [rad^2/m^4] of the step
    Row field_place;        ///< first of the four rows of GalaxyNodes, a whole number
    Row height_place;       ///< first of the four columns
    std::array<Row, 4> field_weight, field_slope, height_weight;
};

/// The numbers of a Galaxy that its field and densities are made from, ready for the loop over samples.
struct GalaxyShape {
    explicit GalaxyShape(const GalaxySpec& galaxy);

    /// exp(start - sqrt(R^2 + core2) over scale - |z| over height).
    struct Layer {
        double core2 = 0, start = 0, inverse_scale = 0, inverse_height = 0;
    };
    double sun_radius, inverse_height_limit;
    Layer old_disc, young_disc, disc_field, vertical_field, random_field, thick_gas, thin_gas;
    double arm, twice_inverse_tan_pitch, twice_phase, inverse_arm_onset2, inverse_arm_height2;
    double young_arm_contrast;
    double disc_strength, sin_pitch, cos_pitch, inverse_disc_onset2, reversal_radius, inverse_reversal_width;
    double halo_strength, halo_height, inverse_halo_width, inverse_halo_radius, inverse_halo_onset;
    double vertical_strength, random_strength, thick_density, thin_density;
    double dispersion_factor;  ///< of (n_e b)^2 step
};

/// Fills in the middles of steps first, first + 1, ... of `steps` even steps in u; at most `capacity`.
///
/// Results do not depend on the processor's vector width.
void make_samples(const GalaxyShape& shape, const GalaxyRay& ray, std::size_t first, std::size_t steps,
                  GalaxySamples& out);

}  // namespace foreglow
