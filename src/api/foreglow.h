// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <filesystem>
#include <optional>
#include <string>
#include <vector>

#include "base/error.h"
#include "base/quantity.h"

namespace foreglow::api {

/// How a study is run from another program.
struct RunOptions {
    std::optional<std::filesystem::path>
        out;  ///< folder to write to; else the study's stem + "-out" in the current folder
    std::vector<std::string> overrides;  ///< "key=value" with dotted keys, as `foreglow make --set`
    bool replace = false;                ///< write into a folder that is not empty, replacing an earlier run
    std::optional<int> threads;          ///< else all processors
};

/// What a run left.
struct RunResult {
    std::filesystem::path out;          ///< maps/, truth/, report.html, run.json
    std::vector<std::string> warnings;  ///< what the command would print as warnings
};

/// Makes the maps of a study file, as `foreglow make STUDY` does; nothing is printed.
/// @throws InputError where the request is wrong; DataError, FileError, NumericError where the work failed.
/// Nothing is left then.
RunResult make_maps(const std::filesystem::path& study, const RunOptions& options = {});

/// Checks a study and says in plain lines what would be done, as `foreglow plan STUDY` does.
/// @throws InputError, DataError as make_maps
[[nodiscard]] std::string plan_maps(const std::filesystem::path& study, const RunOptions& options = {});

/// Returns T(nu)/T(nu0) = (nu/nu0)^(index + curvature ln(nu/nu0)) of brightness temperature (K_RJ).
/// @param index      beta, local at the reference frequency
/// @param curvature  c, half the second derivative of ln T in ln nu
[[nodiscard]] double brightness_ratio(Frequency frequency, Frequency reference, double index,
                                      double curvature = 0);

/// Returns the version of the library, "0.1.0".
[[nodiscard]] std::string library_version();

}  // namespace foreglow::api
