// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <string>

#include "base/progress.h"
#include "io/fits_map_read.h"
#include "model/model_spec.h"
#include "physics/brightness_unit.h"
#include "sphere/sky_map.h"

namespace foreglow {

/// Turns a model's map entry into what the reader of FITS maps is asked for.
[[nodiscard]] FitsMapRequest make_request(const MapSource& source);

/// Returns the frame of a map, from its header or from the model.
/// @throws InputError where both are silent, or one contradicts the other
[[nodiscard]] Frame resolve_frame(const MapSource& source, std::optional<Frame> in_header);

/// Returns the unit of a brightness column, from TUNIT or from the model.
///
/// A TUNIT such as 'K' or 'mK' fits a model's unit of the same scale, and of the same kind where a word
/// behind it says one ('mK,thermodynamic'); any other text than a known unit counts as unknown.
/// @throws InputError where both are silent, or one contradicts the other
[[nodiscard]] BrightnessUnit resolve_unit(const MapSource& source, const std::string& tunit);

/// Returns the sign of U in a map.
/// @throws InputError where both are silent, or one contradicts the other
[[nodiscard]] PolarizationConvention resolve_convention(const MapSource& source,
                                                        std::optional<PolarizationConvention> in_header);

/// Reads a map of one number per pixel that has no unit (an index, a fraction), frame resolved.
[[nodiscard]] SkyMap read_plain_map(const MapSource& source, Progress& progress);

/// Reads a brightness map in K_RJ at a frequency.
[[nodiscard]] SkyMap read_brightness_map(const MapSource& source, Frequency frequency, Progress& progress);

/// Reads Q and U in K_RJ at a frequency, COSMO.
[[nodiscard]] StokesMaps read_stokes_maps(const MapSource& source, Frequency frequency, Progress& progress);

/// Reads a map of polarization angles [deg] as unit vectors (cos 2 chi, sin 2 chi), COSMO.
[[nodiscard]] StokesMaps read_angle_map(const MapSource& source, Progress& progress);

}  // namespace foreglow
