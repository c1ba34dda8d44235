// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <filesystem>
#include <optional>
#include <string>

#include "base/progress.h"
#include "jobs/result_rows.h"

namespace foreglow {

/// What `foreglow index` is asked for.
struct IndexOptions {
    std::filesystem::path surveys;             ///< a surveys file
    std::optional<std::filesystem::path> out;  ///< else the file's stem + "-out" beside the caller
    bool noise_errors_only = false;            ///< errors without calibration and zero levels
    bool replace = false;
    RowFormat format = RowFormat::Table;
};

/// What a run of it left.
struct IndexSummary {
    std::filesystem::path out;
    std::string rows;  ///< what was found over the sky: the maps' means, and the T-T estimates of all of it
};

/// Makes index, amplitude and perhaps curvature maps with errors from surveys, and a T-T estimate beside
/// them: OUT/index.fits, amplitude.fits, scatter.csv and, last, run.json.
///
/// On any error what this run wrote is removed again.
/// @throws every error of reading and writing; InputError where no pixel has an answer
IndexSummary run_index(const IndexOptions& options, Progress& progress);

}  // namespace foreglow
