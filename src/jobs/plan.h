// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <filesystem>
#include <optional>
#include <string>
#include <vector>

#include "model/channel.h"
#include "model/load_sky.h"
#include "model/map_file.h"
#include "model/model_spec.h"
#include "model/study_spec.h"

namespace foreglow {

/// One file that a run will leave, relative to its folder.
struct PlannedFile {
    std::string name;
    std::string what;
    std::int64_t bytes = 0;  ///< 0 where not known before the run (report, manifest)
};

/// A checked study: everything that can be found wrong without reading pixels has been looked at.
struct Plan {
    StudySpec study;
    ModelSpec model;
    std::vector<Channel> channels;
    std::vector<bool> per_pixel;    ///< [channels]: no beam, pixel window or rotation stands in the way
    std::vector<int> realizations;  ///< numbers to be made
    ModelMaps model_maps;           ///< what the headers of the model's maps say
    std::optional<Coverage> coverage;
    std::filesystem::path out;
    std::optional<std::filesystem::path> cache;  ///< folder of integrated Galaxies
    std::vector<PlannedFile> files;
    std::int64_t disk_bytes = 0, memory_bytes = 0;
    double seconds = 0;  ///< rough, from costs measured on two cores
    std::vector<std::string> warnings;
};

/// What `make` and `plan` are asked for besides the study.
struct PlanRequest {
    StudySpec study;
    std::optional<std::filesystem::path> out;  ///< else the study's stem + "-out" beside the caller
    std::optional<int> realization;            ///< just this one
    bool replace = false;
    std::optional<std::filesystem::path> cache;  ///< folder of integrated Galaxies; nothing: none is kept
};

/// Checks a study against its model, its tables and maps, the output folder, the memory and the disk.
/// @throws InputError (exit 2) where the request is wrong or cannot fit; DataError where a file is broken
[[nodiscard]] Plan make_plan(PlanRequest request);

/// Says in plain lines what would be done.
[[nodiscard]] std::string describe_plan(const Plan& plan);

/// Returns a map's file stem: NAME, or NAME_r0003 where a study has several realizations.
[[nodiscard]] std::string map_stem(const Plan& plan, const std::string& channel, int realization);

}  // namespace foreglow
