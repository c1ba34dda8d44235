// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <filesystem>
#include <optional>
#include <string>
#include <vector>

#include "base/progress.h"
#include "base/quantity.h"
#include "jobs/row_format.h"

namespace foreglow {

/// What `foreglow grade` is asked for.
struct GradeOptions {
    std::filesystem::path source;                  ///< a finished run's folder, or a study file
    std::vector<std::filesystem::path> recovered;  ///< maps or folders of maps; none: the floor
    std::optional<std::string> terms;  ///< K, or amplitude, amplitude+index, amplitude+index+curvature
    bool linear = false;               ///< fits y in place of ln y
    double tilt = -2.7;                ///< index of the reference power law
    std::optional<std::filesystem::path> mask;
    std::optional<Angle> common_beam;
    std::optional<int> nside;                    ///< grades on a coarser grid
    std::vector<double> cuts{0, 20};             ///< |b| in degrees, of recovered maps
    std::optional<std::filesystem::path> study;  ///< where the study of a run is, for its response tables
    std::optional<int> realization;              ///< of a run with several
    std::optional<std::filesystem::path> out;    ///< else RUN/grade; for a study nothing is written without
    bool replace = false;
    RowFormat format = RowFormat::Table;
};

struct GradeSummary {
    std::string rows;
};

/// Scores what a subtraction recovered against the truth or, without recovered maps, says what a smooth fit
/// across the channels leaves (floor_fit.h), and writes residual maps, spectra and a manifest to RUN/grade.
///
/// A study is made in a temporary folder on a coarse grid, and graded there.
/// @throws InputError where the request is wrong; DataError, FileError where a file is broken
GradeSummary run_grade(const GradeOptions& options, Progress& progress);

}  // namespace foreglow
