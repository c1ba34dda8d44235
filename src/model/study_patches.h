// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <vector>

#include "io/toml_reader.h"
#include "model/study_spec.h"

namespace foreglow {

/// Reads one [[patch]]: name, center, size, pixel.
/// @throws InputError with the place
[[nodiscard]] PatchSpec read_patch(TomlReader reader);

/// Checks that the names of patches differ.
void check_patch_names(const std::vector<PatchSpec>& patches);

}  // namespace foreglow
