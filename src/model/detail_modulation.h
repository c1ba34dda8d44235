// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <span>
#include <vector>

#include "base/quantity.h"
#include "sphere/grid.h"

namespace foreglow {

/// Returns a map smoothed from its own Gaussian beam to a wider one, undefined pixels filled first; [npix].
[[nodiscard]] std::vector<double> make_envelope(const HealpixGrid& grid, std::span<const double> map,
                                                Angle own_fwhm, Angle fwhm);

/// Returns P = sqrt(Q^2 + U^2) of Q and U smoothed likewise, by spin-2 transforms.
[[nodiscard]] std::vector<double> make_polarized_envelope(const HealpixGrid& grid, std::span<const double> q,
                                                          std::span<const double> u, Angle own_fwhm,
                                                          Angle fwhm);

/// How the local amplitude follows a smooth brightness.
struct Modulation {
    std::vector<float> weights;  ///< w [npix], in single precision: an amplitude, good to 6e-8
    double mean_brightness = 0;  ///< over the region
    double floored = 0;          ///< share of the sky where the floor holds
};

/// Makes w = x^q / sqrt(<apo^2 x^2q> / <apo^2>) with x = max(I0, floor <I0>): the mean square over the region
/// is 1, so that w g has there the spectrum of g, for l above the bandwidth of w.
/// @param brightness  I0, [npix], all defined
/// @param region      apo, [npix]
/// @throws DataError where the region has no pixel or its mean brightness is not positive (q > 0)
[[nodiscard]] Modulation make_modulation(std::span<const double> brightness, std::span<const double> region,
                                         double power, double floor);

}  // namespace foreglow
