// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <algorithm>
#include <array>

#include "model/model_spec.h"
#include "sphere/alm.h"
#include "sphere/gaussian_field.h"

namespace foreglow {

// The closed formulas of the bundled invented sky (docs/models.md), for whole maps and for single pixels.

/// The Gaussian fields of the sketch; the number is that of the random numbers' field.
enum class SketchField : std::uint32_t { Texture = 1, Index = 2, Curvature = 3, E = 4, B = 5 };

/// The scale below which the sketch has no structure.
inline constexpr double sketch_finest_scale_deg = 1.0;

/// Returns the largest l of the fields on a grid, min(2048, 2 nside).
[[nodiscard]] int sketch_lmax(const HealpixGrid& grid);

/// Draws the a_lm of a field of unit variance (B: of half the power of E).
[[nodiscard]] Alm make_sketch_alm(const SketchSpec& sketch, const HealpixGrid& grid, SketchField field);

/// Returns disc, plane and loops at a direction, K_RJ.
[[nodiscard]] double sketch_brightness(const SketchSpec& sketch, const Vector3& n);

/// Returns the brightness with its texture (a field of unit variance), K_RJ.
[[nodiscard]] double sketch_intensity(const SketchSpec& sketch, const Vector3& n, double texture);

/// Returns mean + rms f, f a field of unit variance cut at 4 standard deviations.
[[nodiscard]] inline double sketch_scattered(double mean, double rms, double field) {
    return mean + rms * std::clamp(field, -4.0, 4.0);
}

/// Returns Q and U, COSMO, in the unit of the intensity.
///
/// Field lines along the plane give E vectors across it (Q > 0 in COSMO); a random part turns them, the plane
/// depolarizes.
[[nodiscard]] std::array<double, 2> sketch_stokes(const SketchSpec& sketch, const Vector3& n,
                                                  double intensity, double random_q, double random_u);

}  // namespace foreglow
