// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <filesystem>
#include <string>
#include <vector>

#include "base/progress.h"
#include "io/json_value.h"

namespace foreglow {

/// Describes the files that a run read: name without its folder, bytes, SHA-256.
[[nodiscard]] JsonValue describe_input_files(const std::vector<std::filesystem::path>& inputs);

/// Describes the files that a run wrote: name within its folder, bytes, XXH3-128, and SHA-256 where asked
/// for.
[[nodiscard]] JsonValue describe_output_files(const std::filesystem::path& folder,
                                              const std::vector<std::string>& names, bool with_sha256);

/// Describes how long each phase took.
[[nodiscard]] JsonValue describe_timings(const Progress& progress);

[[nodiscard]] JsonValue describe_texts(const std::vector<std::string>& texts);

/// Returns what was said on the terminal, with the folders of the inputs left out.
[[nodiscard]] JsonValue describe_texts_without_folders(const std::vector<std::string>& texts,
                                                       const std::vector<std::filesystem::path>& inputs);

/// Returns a study's or model's text as used, but for absolute paths, which would tell of the machine.
[[nodiscard]] std::string without_absolute_paths(const std::string& text);

}  // namespace foreglow
