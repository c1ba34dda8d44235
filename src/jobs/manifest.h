// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <filesystem>
#include <string>
#include <vector>

#include "base/progress.h"
#include "jobs/make_maps.h"
#include "jobs/plan.h"

namespace foreglow {

/// Makes the text of run.json: study and model as used, versions, seeds, accuracy, timings, inputs with
/// SHA-256, outputs with XXH3-128.
///
/// It names no path outside the output folder and no host: inputs go by their file names.
/// @param with_sha256  outputs get SHA-256 as well
[[nodiscard]] std::string make_manifest(const Plan& plan, const MakeResult& result, const Progress& progress,
                                        bool with_sha256);

/// Returns every file that a run reads: study, model, maps, tables, coverage; sorted, each once.
[[nodiscard]] std::vector<std::filesystem::path> list_plan_inputs(const Plan& plan);

/// Returns the files that a manifest lists as outputs; none where it cannot be read.
[[nodiscard]] std::vector<std::string> list_manifest_outputs(const std::filesystem::path& manifest);

}  // namespace foreglow
