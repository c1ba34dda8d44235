// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <vector>

#include "base/quantity.h"
#include "sphere/sky_map.h"

namespace foreglow {

/// The law of a sky in each pixel, before beams: brightness [K_RJ], index and curvature at one frequency.
struct PixelLaws {
    SkyMap brightness;
    std::vector<double> index, curvature;  ///< [npix]
};

/// Carries amplitude, index and curvature from nu0 to another frequency: T = A exp((beta + c x) x), beta + 2
/// c x, c.
/// @param log_ratio  x = ln(nu/nu0)
void carry_laws(PixelLaws& laws, double log_ratio);

/// Returns brightness, index and curvature that the sky has after a Gaussian beam, at the same frequency.
///
/// With <> the smoothing: T_s = <T>, beta_s = <T beta>/T_s, c_s = (<T (beta^2 + 2 c)>/T_s - beta_s^2)/2:
/// first and second derivative of ln <T> in ln nu. A beam mixes power laws into a curved one, so this is what
/// a perfect recovery from maps of that resolution finds, not the index of the sky before the beam.
/// @param fwhm  0 returns them as they are
/// @param lmax  of the smoothing
[[nodiscard]] PixelLaws smooth_laws(const PixelLaws& laws, Angle fwhm, int lmax);

}  // namespace foreglow
