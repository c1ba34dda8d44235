// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include "base/quantity.h"
#include "model/model_spec.h"
#include "model/sky_model.h"

namespace foreglow {

/// Makes the bundled invented sky on a grid, in galactic coordinates, from closed formulas (docs/models.md).
///
/// A disc layer (cosecant law, softened), a plane, four rings on the geometry of the radio loops (Berkhuijsen
/// 1971: centres and diameters; brightnesses invented) and Gaussian fields keyed by (seed, field, l, m), so
/// that every nside shows the same sky. Nothing in it is measured. All of it is smoother than 1 degree.
[[nodiscard]] SkyModel make_sketch_sky(const SketchSpec& sketch, Frequency reference, const HealpixGrid& grid,
                                       bool with_polarization);

}  // namespace foreglow
