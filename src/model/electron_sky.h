// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include "model/model_spec.h"
#include "model/sky_model.h"

namespace foreglow {

/// Turns a sky's indices into the slopes of its electrons, in all pixels: where its index was measured, the
/// law with that slope has that index. Call it again after the indices have changed.
/// @param sky  its `electrons` hold law and maps
/// @throws DataError where no index is defined, or a map of field or energies has values not above 0
void find_electron_slopes(SkyModel& sky);

/// Returns the sentence that tells a user of pixels whose index no electrons have; "" where there are none.
[[nodiscard]] std::string describe_clamped_pixels(const SkyModel& sky);

}  // namespace foreglow
