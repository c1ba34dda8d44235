// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <filesystem>

#include "io/toml_reader.h"
#include "model/model_spec.h"

namespace foreglow {

/// Reads [electrons] of a model file; every key is checked by itself and against the others.
/// @param folder  what paths are relative to
/// @throws InputError with the place
[[nodiscard]] ElectronsSpec read_electrons(TomlReader reader, const std::filesystem::path& folder);

}  // namespace foreglow
