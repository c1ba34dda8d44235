// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>

#include "base/progress.h"
#include "model/galaxy_sky.h"
#include "model/model_spec.h"
#include "model/sky_model.h"

namespace foreglow {

/// What the headers of a model's maps say.
struct ModelMaps {
    Frame frame = Frame::Galactic;  ///< in which the law acts: that of the intensity map
    std::int64_t held_values = 0;   ///< numbers that stay in memory while maps are made
    int largest_nside = 0;          ///< of the maps to be read; 0 for the bundled sky
};

/// Checks what the headers of a model's maps say against what the model says, without reading pixels; `plan`
/// and `make` call it first.
///
/// A missing or unknown unit, frame or polarization convention is a question to the user: the message names
/// the line to add.
/// @throws InputError where something is left open or contradicts; DataError where a file is broken
/// @param channels  that the built-in Galaxy would be integrated for
[[nodiscard]] ModelMaps check_model_maps(const ModelSpec& model, const HealpixGrid& grid, int lmax,
                                         bool with_polarization, std::span<const Channel> channels = {});

/// Reads a model's maps and makes the sky on a grid, in the frame of the intensity map.
///
/// A map on that grid and frame is used pixel for pixel. Another intensity or polarization map is brought
/// there through its a_lm up to min(lmax, 2.5 nside of the map), undefined pixels filled first (a finer map
/// is analysed up to 2.5 lmax, so that what lies above lmax is not pressed into what lies below); indices,
/// curvatures and fractions by bilinear interpolation, or, from a finer grid, by the mean weighted with the
/// brightness.
/// @param use  what the sky will be asked for; only the built-in Galaxy wants it
/// @throws InputError, DataError, FileError as above and as the reader of maps
[[nodiscard]] SkyModel load_sky(const ModelSpec& model, const HealpixGrid& grid, int lmax,
                                bool with_polarization, Progress& progress, const SkyUse& use = {});

}  // namespace foreglow
