// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <filesystem>
#include <optional>
#include <span>

#include "base/progress.h"
#include "model/channel.h"
#include "model/galaxy_spec.h"
#include "model/sky_model.h"

namespace foreglow {

/// What a sky will be asked for: an integrated one is integrated for it.
struct SkyUse {
    std::span<const Channel> channels;
    double accuracy = 1e-5;
    std::optional<std::filesystem::path> cache;  ///< folder of integrated maps; nothing: none is kept
};

/// Integrates the built-in Galaxy for some channels.
///
/// K frequencies are chosen between the lowest and the highest of all bands (Chebyshev points in ln nu, as
/// many as bring the interpolation's error on sampled pixels below what is asked for; or the channels' own
/// frequencies, where these are fewer), and five around the reference frequency for amplitude, tangent index
/// and curvature there. Q and U go the same way; where Faraday rotation turns them too fast for that, each
/// channel's are averaged over its band in each pixel.
[[nodiscard]] SkyModel make_galaxy_sky(const GalaxySpec& galaxy, Frequency reference, const HealpixGrid& grid,
                                       bool polarized, const SkyUse& use, Progress& progress);

/// Returns about how many map values an integrated sky holds: nodes, truth, and Q and U of each channel where
/// they may have to be made band by band.
[[nodiscard]] std::int64_t count_galaxy_values(const HealpixGrid& grid, bool polarized,
                                               std::span<const Channel> channels);

}  // namespace foreglow
