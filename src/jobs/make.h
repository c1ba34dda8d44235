// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <filesystem>
#include <optional>
#include <string>

#include "base/progress.h"
#include "jobs/plan.h"

namespace foreglow {

/// What `foreglow make` is asked for.
struct MakeOptions {
    PlanRequest plan;
    bool sha256 = false;  ///< outputs get SHA-256 as well as XXH3-128
};

/// What a run left.
struct MakeSummary {
    std::filesystem::path out;
    std::string text;  ///< for a person: what was made, its accuracy, where to look
};

/// Does the main job: plans, loads the sky, writes maps, truth, report and, last, the manifest.
///
/// On any error what this run wrote is removed again.
/// @throws every error of make_plan and of reading and writing
MakeSummary run_make(MakeOptions options, Progress& progress);

}  // namespace foreglow
