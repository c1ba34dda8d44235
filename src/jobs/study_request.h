// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <filesystem>
#include <optional>

#include "jobs/plan.h"
#include "model/study_file.h"

namespace foreglow {

/// A study as a command line names it: a file, or options alone.
struct StudyRequest {
    std::optional<std::filesystem::path> study;
    StudyOptions options;  ///< its overrides serve both; the rest only without a file
    std::optional<std::filesystem::path> out;
    std::optional<int> realization;
    bool replace = false;
    std::optional<std::filesystem::path> cache;  ///< else the default cache folder
    bool no_cache = false;
};

/// Reads or makes the study.
/// @throws InputError where neither or both are given, and as read_study and make_study_from_options
[[nodiscard]] PlanRequest make_plan_request(const StudyRequest& request);

}  // namespace foreglow
