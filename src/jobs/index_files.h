// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "base/progress.h"
#include "estimate/index_maps.h"
#include "estimate/scatter_fit.h"
#include "estimate/smoothed_survey.h"
#include "estimate/survey_file.h"
#include "estimate/zero_level_fit.h"
#include "jobs/output_folder.h"

namespace foreglow {

/// All that a run of `foreglow index` found.
struct IndexResult {
    SurveysSpec spec;
    SmoothedSurveys smoothed;
    std::optional<ZeroLevelFit> zero_levels;
    IndexMaps maps;
    std::vector<ScatterCell> cells;
    bool common_errors = true;
};

/// Writes index.fits, amplitude.fits and scatter.csv and returns their names.
[[nodiscard]] std::vector<std::string> write_index_files(const IndexResult& result, OutputFolder& folder);

/// Makes the text of run.json: what was asked, how it was done, counts with reasons, inputs and outputs with
/// sums.
[[nodiscard]] std::string make_index_manifest(const IndexResult& result,
                                              const std::vector<std::string>& outputs,
                                              const OutputFolder& folder, const Progress& progress);

/// Says in words why pixels have no answer, with counts; "" where all have one.
[[nodiscard]] std::string describe_undefined(const IndexResult& result);

}  // namespace foreglow
