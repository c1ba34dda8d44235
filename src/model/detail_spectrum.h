// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <filesystem>
#include <optional>
#include <string>
#include <vector>

#include "base/quantity.h"
#include "model/detail_spec.h"
#include "model/spectrum_fit.h"

namespace foreglow {

/// The spectra of the true sky, K_RJ^2, [lmax + 1] each; those of polarization are empty without it.
struct SkySpectra {
    std::vector<double> tt, ee, bb;
    std::vector<double> correlation;  ///< of T and E, C_TE / sqrt(C_TT C_EE)
};

/// Where spectra come from besides what the model says.
struct SpectrumSources {
    Frequency intensity_reference, polarization_reference;
    std::optional<SpectrumFit> intensity_fit, polarization_fit;
    bool polarized = false;
};

/// Returns the spectra of the true sky that a model asks for, from l = 2 on: a table, or power laws given or
/// fitted (C_l = A (l/l_p)^slope), C_BB = b_to_e C_EE, constant correlation.
/// @throws DataError where a table is broken; InputError where a fit is wanted and there is none
[[nodiscard]] SkySpectra make_sky_spectra(const DetailSpec& spec, const SpectrumSources& sources, int lmax);

/// What is drawn below the beams, K_RJ^2, [lmax + 1] each.
struct DetailSpectra {
    std::vector<double> tt, ee, bb;
    std::vector<double> correlation;  ///< rho_l of the drawn T and E, between -1 and 1
    int capped = 0;                   ///< l where |rho_l| had to be cut to 1
    double largest_correlation = 0;   ///< |rho_l| before that
};

/// Returns the complement of what the templates hold: C_TT (1 - B_T^2), C_EE (1 - B_P^2), C_BB (1 - B_P^2)
/// and, so that the sum has the sky's C_TE, rho_l = rho (1 - B_T B_P) / sqrt((1 - B_T^2)(1 - B_P^2)).
[[nodiscard]] DetailSpectra make_complement(const SkySpectra& sky, Angle intensity_beam,
                                            Angle polarization_beam);

/// Divides rho_l by a number, so that fields that are then modulated differently keep the sky's C_TE; cut
/// to 1.
/// @param overlap  above 0
void raise_correlation(DetailSpectra& spectra, double overlap);

}  // namespace foreglow
