// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <filesystem>
#include <memory>
#include <optional>
#include <string>
#include <vector>

#include "base/progress.h"
#include "base/quantity.h"
#include "jobs/grade.h"
#include "jobs/temporary_run.h"
#include "model/channel.h"
#include "model/study_spec.h"
#include "sphere/sky_map.h"

namespace foreglow {

/// One channel of what is graded.
struct GradeChannel {
    Channel channel;
    std::filesystem::path map;
    std::optional<double> noise;  ///< rms per pixel of the study's grid, in the study's unit
};

/// The maps that are graded, and what they mean.
struct GradeSource {
    StudySpec study;
    std::filesystem::path folder;  ///< of maps/ and truth/
    bool is_run = false;
    std::vector<GradeChannel> channels;
    std::unique_ptr<TemporaryRun> temporary;  ///< of a study
};

/// Opens a finished run, or makes the maps of a study on a coarse grid (64, or --nside; its own where that is
/// coarser).
///
/// A run's bands come from the study text in its run.json; response tables are looked for beside the run's
/// folder or beside --study, and must have the SHA-256 that the run noted.
/// @throws InputError with what to do
[[nodiscard]] GradeSource open_grade_source(const GradeOptions& options, Progress& progress);

/// Reads one column of a map of the source, RING order.
[[nodiscard]] std::vector<double> read_grade_column(const std::filesystem::path& map,
                                                    const std::string& column);

/// Reads I of a channel at the common beam where one is asked for, on the grid of --nside.
[[nodiscard]] std::vector<double> read_grade_channel(const GradeSource& source, const GradeOptions& options,
                                                     std::size_t channel, const HealpixGrid& grid);

}  // namespace foreglow
