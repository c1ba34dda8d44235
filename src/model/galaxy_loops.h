// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <span>
#include <vector>

#include "base/quantity.h"
#include "model/galaxy_samples.h"
#include "model/galaxy_table.h"

namespace foreglow {

/// What one loop shows in one direction.
struct LoopLight {
    double brightness = 0;            ///< at 408 MHz [K_RJ]
    double q_share = 0, u_share = 0;  ///< Q and U (COSMO) over brightness and over the intrinsic fraction Pi
};

/// Returns the light of a shell along a line of sight, from the chord through it.
///
/// brightness = T0 chord/(longest chord) [f + (1 - f) ((1 + cos(PA - PA0))/2)^q]; the field on the shell is a
/// uniform one towards l = 80, b = 0 less its part along the radius, taken in the middles of the near and the
/// far half of the chord, polarized by Bt^2/(Bt^2 + 1/3) of Pi.
[[nodiscard]] LoopLight loop_light(const GalaxyLoop& loop, const GalaxyRay& ray);

/// The spectra of the loops: those of the old disc in the plane, in each loop's own field.
struct LoopSpectra {
    /// @param frequencies  [K]
    LoopSpectra(const GalaxySpec& galaxy, const GalaxyTable& table, std::span<const Frequency> frequencies);

    std::vector<std::vector<double>> ratio;     ///< brightness over that at 408 MHz, [loops][K]
    std::vector<std::vector<double>> fraction;  ///< Pi, [loops][K]
};

}  // namespace foreglow
