// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <filesystem>
#include <string>

#include "model/model_spec.h"

namespace foreglow {

/// Reads a model file; paths in it are relative to it and must exist.
/// @throws InputError "FILE:LINE:COLUMN: ..." where a key, a type, a value or a path is wrong, or keys
/// contradict each other
[[nodiscard]] ModelSpec read_model(const std::filesystem::path& path);

/// Reads a bundled model.
/// @throws InputError where there is none of that name; the nearest is named
[[nodiscard]] ModelSpec read_bundled_model(const std::string& name);

/// Makes a model from TOML text, as read_model does.
/// @param file    stands in the places of messages; paths are relative to its folder; empty for a bundled
/// model
/// @param name    the bundled name, or the file's stem
[[nodiscard]] ModelSpec make_model(const std::string& text, const std::filesystem::path& file,
                                   const std::string& name);

}  // namespace foreglow
