// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstddef>

#include "model/galaxy_integral.h"
#include "model/galaxy_spec.h"

namespace foreglow {

/// How finely lines of sight are sampled: steps of the midpoint rule near the plane (|b| < 5 deg) and
/// elsewhere, and what that leaves.
struct GalaxySampling {
    std::size_t steps_near_plane = 128, steps_elsewhere = 48;
    double error = 0;  ///< largest error of I, or of (Q, U), over I, on lines of sight all over the sky
};

/// Raises the steps until the change from doubling them, seen on some 400 lines of sight, is below the
/// Galaxy's tolerance; never below 128 and 48 for tolerances of 1e-3 and finer.
[[nodiscard]] GalaxySampling choose_sampling(const GalaxySpec& galaxy, const GalaxyIntegral& integral,
                                             bool polarized);

}  // namespace foreglow
