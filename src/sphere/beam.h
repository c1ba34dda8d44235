// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <vector>

#include "base/quantity.h"
#include "sphere/alm.h"

namespace foreglow {

/// What a round beam or a pixel does to a_lm: B_l for temperature and for E and B, both [lmax + 1].
struct BeamWindow {
    std::vector<double> temperature;
    std::vector<double> polarization;

    [[nodiscard]] int lmax() const { return static_cast<int>(temperature.size()) - 1; }
    bool operator==(const BeamWindow&) const = default;
};

/// Makes a Gaussian beam: B_l = exp(-l (l + 1) sigma^2 / 2), sigma = fwhm / sqrt(8 ln 2); E and B times exp(2
/// sigma^2).
///
/// The factor is what spin 2 brings (Challinor et al. 2000; the HEALPix libraries do the same); E and B begin
/// at l = 2 and their window is 0 below.
/// @param fwhm  0 for no beam
[[nodiscard]] BeamWindow make_gaussian_beam(Angle fwhm, int lmax);

/// Makes a window from tables; without a table for polarization that of temperature serves both.
/// @param temperature   [l], l = 0..; not empty
/// @param polarization  empty or of the same length; what it says of l = 0 and 1 is put to 0
[[nodiscard]] BeamWindow make_tabulated_beam(std::vector<double> temperature,
                                             std::vector<double> polarization = {});

/// Reads the window of a HEALPix pixel up to lmax (at most 4 nside), as the package healpy-data has it.
///
/// The folder is that of the environment variable FOREGLOW_HEALPIX_DATA, else /usr/share/healpy/data.
/// @throws InputError where the file is missing, nside has none (1) or lmax is above 4 nside
/// @throws DataError where the file cannot be read
[[nodiscard]] BeamWindow read_pixel_window(int nside, int lmax);

/// Returns the product of two windows, up to the smaller lmax.
[[nodiscard]] BeamWindow product(const BeamWindow& a, const BeamWindow& b);

/// Multiplies a_lm by the window; terms beyond the window's lmax become zero.
void apply_beam(const BeamWindow& beam, Alm& temperature);
void apply_beam(const BeamWindow& beam, AlmEB& polarization);

/// Returns the highest l whose window exceeds a threshold in size, for temperature or polarization; 0 when
/// none does.
[[nodiscard]] int highest_l(const BeamWindow& beam, double threshold = 1e-7);

}  // namespace foreglow
