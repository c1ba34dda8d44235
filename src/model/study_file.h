// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <filesystem>
#include <optional>
#include <string>
#include <vector>

#include "io/toml_document.h"
#include "model/study_spec.h"

namespace foreglow {

/// Reads a study file, every key checked by itself and against the others; no map and no table is opened yet.
///
/// Paths in the file are relative to it, paths in overrides to the caller's folder.
/// @param overrides  "key=value" as given to --set, applied in order (see apply_override)
/// @throws InputError "FILE:LINE:COLUMN: ..." or "--set key=value: ..." where the request is wrong
[[nodiscard]] StudySpec read_study(const std::filesystem::path& path,
                                   const std::vector<std::string>& overrides = {});

/// The options of `make` without a study file; each is the study's key of that name, what is absent has the
/// study's default.
struct StudyOptions {
    std::string model;                     ///< --model: a bundled model's name or a path
    std::vector<std::string> frequencies;  ///< --frequency "70 GHz", one channel each, named "70GHz"
    std::optional<std::string> title;
    std::optional<std::int64_t> nside;  ///< needed
    std::optional<std::string> stokes, unit, precision, frame, ordering, polarization_convention, monopole,
        coverage;
    std::optional<std::string> bandwidth, beam_fwhm;  ///< of every channel
    std::optional<std::int64_t> lmax, seed, realizations;
    std::optional<double> accuracy;
    std::optional<std::string> truth;    ///< "false", "true" or "full"
    std::vector<std::string> overrides;  ///< --set
};

/// Makes a study from options alone: the same checks, the same StudySpec; its `source` is the study file that
/// says the same.
/// @throws InputError "--frequency: ..." where the request is wrong
[[nodiscard]] StudySpec make_study_from_options(const StudyOptions& options);

/// Makes a study from a parsed document.
/// @param file  empty where there is none; relative paths are then relative to the caller's folder
[[nodiscard]] StudySpec make_study(const TomlValue& document, const std::filesystem::path& file);

}  // namespace foreglow
