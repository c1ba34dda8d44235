// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <filesystem>
#include <optional>
#include <string>
#include <vector>

#include "io/fits_map_read.h"

namespace foreglow {

/// What `foreglow start` is asked for.
struct StartRequest {
    std::optional<std::filesystem::path> output;     ///< the file to write; else the text is printed
    std::optional<std::filesystem::path> model_for;  ///< a downloaded map: a model for it instead of a study
};

struct StartResult {
    std::string text;
    int questions = 0;                 ///< what the map's header leaves open
    std::vector<std::string> notices;  ///< one line each, about the map's header
};

/// Makes the text of a commented study or, for a map, of a model, and writes it where a file is named.
/// @throws InputError where the output exists or the map does not; DataError where the map's header is
/// broken; FileError
[[nodiscard]] StartResult run_start(const StartRequest& request);

/// Returns a commented study to begin from; it is complete, and `make` runs it as it stands.
[[nodiscard]] std::string make_start_study();

/// Makes a model for a map from its header; what the header leaves open are lines that begin with "#?".
/// @param map  the path to be written into the model, as seen from the model file's folder
[[nodiscard]] StartResult make_start_model(const FitsMapHeader& header, const std::filesystem::path& map);

}  // namespace foreglow
