// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <optional>
#include <span>
#include <string>
#include <vector>

#include "base/progress.h"
#include "jobs/output_folder.h"
#include "jobs/plan.h"
#include "model/detailed_sky.h"
#include "model/harmonic_route.h"
#include "model/map_statistics.h"
#include "model/sky_model.h"
#include "sphere/sky_map.h"

namespace foreglow {

/// What became of one channel.
struct ChannelOutcome {
    double accuracy = 0;  ///< reached; see the study's `accuracy`
    bool per_pixel = false;
    MapStatistics i, q, u;    ///< of the first realization's map, in the study's unit
    double mean_removed = 0;  ///< with monopole = "remove"
};

/// A map thinned out for a picture: the pixel at the centre of each pixel of a coarser grid.
struct Preview {
    std::string channel;
    std::vector<SkyMap> columns;  ///< I or I, Q, U, in the study's unit and frame, COSMO
};

struct MakeResult {
    std::vector<ChannelOutcome> channels;  ///< [channels]
    std::vector<Preview> previews;         ///< of a few channels
    HarmonicReport harmonic;               ///< of the channels with beams
    bool has_harmonic = false;
    std::vector<std::string> outputs;      ///< names within the output folder, in order
    std::vector<std::string> labels;       ///< the sky's own cautions
    std::optional<DetailReport> detail;    ///< where the model has one
    DetailCounts detail_counts;            ///< of the first realization
    std::optional<ElectronSky> electrons;  ///< likewise, where the model has them
};

/// Makes and writes the maps of all channels for some of the plan's realizations, which are the same sky.
///
/// Statistics, previews and accuracies are taken of the plan's first one.
void write_channel_maps(const Plan& plan, const SkyModel& sky, std::span<const int> realizations,
                        OutputFolder& folder, Progress& progress, MakeResult& result);

/// Writes amplitude, tangent index and curvature at the reference frequency before beams and, for "full",
/// each channel's sky.
/// @param realization  of the sky, where each has its own files; nothing: one set serves all
void write_truth_maps(const Plan& plan, const SkyModel& sky, std::optional<int> realization,
                      OutputFolder& folder, Progress& progress, MakeResult& result);

}  // namespace foreglow
