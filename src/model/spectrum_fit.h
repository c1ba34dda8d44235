// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <span>
#include <string>
#include <vector>

#include "base/quantity.h"
#include "model/detail_spec.h"
#include "sphere/sky_map.h"

namespace foreglow {

/// One bin of a measured spectrum.
struct SpectrumBin {
    double l = 0;          ///< mean of its l, weighted with 2l+1
    double cl = 0;         ///< K_RJ^2, beam taken out
    double log_error = 0;  ///< of ln C_l
};

/// C_l = amplitude (l / pivot)^slope, fitted to a map's own spectrum.
struct SpectrumFit {
    double slope = 0, slope_error = 0;
    double amplitude = 0, log_amplitude_error = 0;  ///< C_l at the pivot, K_RJ^2
    double pivot = 0;                               ///< geometric mean of the range's ends
    LRange lrange;
    double reduced_chi2 = 0;
    double sky_fraction = 0;  ///< effective, <apo^2>^2 / <apo^4>
    std::vector<SpectrumBin> bins;
};

/// Returns where a fit is made when the model does not say: from 30 (less under a wide beam) to the l where
/// B_l^2 falls below 1/2.
[[nodiscard]] LRange default_fit_lrange(Angle beam_fwhm);

/// Fits a power law to a spectrum: bins of 10 multipoles (fewer where there are not 60), (2l+1)-weighted; a
/// straight line through ln C against ln l with weights nu/2, nu = f sum (2l+1), the mean of a ln chi^2_nu
/// (-1/nu) taken out. Errors are scaled up by the root of the reduced chi^2 where it is above 1: a real sky
/// is not Gaussian.
/// @param cl   [l], beam taken out
/// @param sky_fraction  f
/// @throws InputError "PLACE: ..." with fewer than 4 bins of positive power or a slope above -1
[[nodiscard]] SpectrumFit fit_power_law(std::span<const double> cl, const LRange& lrange, double sky_fraction,
                                        const std::string& place, const std::string& what);

/// Measures a template's spectrum beyond a galactic latitude and fits it: pseudo-C_l of apo (I - mean) over
/// <apo^2> B_l^2.
/// @param map    K_RJ, at its own nside
/// @param place  of [detail], for messages
/// @throws InputError as above, and where the range ends beyond B_l^2 = 0.3 or 2 nside of the map
[[nodiscard]] SpectrumFit fit_intensity(const SkyMap& map, Angle beam_fwhm, Angle latitude_cut,
                                        const LRange& lrange, const std::string& place);
/// Likewise EE of Q and U.
[[nodiscard]] SpectrumFit fit_polarization(const StokesMaps& maps, Angle beam_fwhm, Angle latitude_cut,
                                           const LRange& lrange, const std::string& place);

}  // namespace foreglow
