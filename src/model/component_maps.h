// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <array>
#include <cstdint>
#include <functional>
#include <span>
#include <vector>

#include "model/sky_model.h"
#include "model/spectral_basis.h"

namespace foreglow {

/// Make the smallest basis of component maps for some channels (make_spectral_basis), of intensity and of Q
/// and U.
[[nodiscard]] SpectralBasis make_intensity_basis(const SkyModel& sky, const std::vector<BandSum>& channels,
                                                 double tolerance);
[[nodiscard]] SpectralBasis make_polarized_basis(const SkyModel& sky, const std::vector<BandSum>& channels,
                                                 double tolerance);

/// Makes the whole sky in one component band, RING order, undefined pixels NaN; its relative error is below
/// component_tolerance.
/// @return [npix]
[[nodiscard]] std::vector<double> make_intensity_component(const SkyModel& sky, const BandSum& component);
inline constexpr double component_tolerance = 1e-9;  // far below any accuracy that transforms reach

struct StokesComponent {
    std::vector<double> q, u;  ///< [npix]
};
[[nodiscard]] StokesComponent make_polarized_component(const SkyModel& sky, const BandSum& component);

/// Pixels of a sky taken evenly over it, with their directions.
struct SkySample {
    SkyStrip values;
    std::vector<Vector3> directions;
};

/// Takes about `count` pixels, evenly spaced in RING order (all of them where the sky has no more).
[[nodiscard]] SkySample make_sky_sample(const SkyModel& sky, std::int64_t count, bool with_polarization);

/// Calls work(strip, values) for strips that cover the sky, in order.
void for_each_sky_strip(const SkyModel& sky, bool with_polarization,
                        const std::function<void(const RingStrip&, const SkyStrip&)>& work);

}  // namespace foreglow
