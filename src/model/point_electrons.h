// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <vector>

#include "model/point_values.h"
#include "model/sky_law.h"
#include "model/sky_model.h"
#include "physics/electron_band.h"

namespace foreglow {

// Pixels whose spectra are those of electrons. Polynomials are made over the range of the pixels that are
// asked for, a single point for a single pixel, so that a value depends on the others asked with it by less
// than 1e-9 of itself.

/// Turns the indices of a strip into the slopes of its electrons and empties index and curvature, as
/// make_sky_strip has them.
/// @param strip       index as measured where `definition` says; field, break_energy, cutoff_energy of maps
/// @param reference   of the sky
void find_point_slopes(const ElectronLaw& law, const IndexDefinition& definition, Frequency reference,
                       SkyStrip& strip);

/// Returns a band's number per unit amplitude at the reference, [n]; NaN where undefined.
[[nodiscard]] std::vector<double> make_electron_factors(const ElectronLaw& law, EmissionPart part,
                                                        const SkyStrip& strip, Frequency reference,
                                                        const BandSum& band);

/// The local index d ln T/d ln nu and half the second derivative, [n] each.
struct LocalColumns {
    std::vector<double> index, curvature;
};
/// Takes both from five points 0.05 apart in ln nu (SpectralStencil): to 1e-7, and 2e-7 of the fifth
/// derivative.
[[nodiscard]] LocalColumns make_local_electron_columns(const ElectronLaw& law, const SkyStrip& strip,
                                                       Frequency at);

/// Makes what make_point_values makes, for electrons.
/// @param reference_index  the local index at the reference, [n]
[[nodiscard]] PointValues make_electron_values(const ElectronLaw& law, const SkyStrip& strip,
                                               const std::vector<double>& reference_index,
                                               Frequency reference, Frequency polarized_reference,
                                               const BandSum& band, Frequency at);

}  // namespace foreglow
