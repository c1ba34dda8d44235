// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <filesystem>
#include <optional>

#include "io/toml_reader.h"
#include "model/model_spec.h"

namespace foreglow {

/// Read one section of a model file each; every key of the section is checked.
/// @param folder  what paths are relative to
/// @throws InputError with the place
[[nodiscard]] SketchSpec read_sketch(TomlReader reader);
[[nodiscard]] IntensitySpec read_intensity(TomlReader reader, const std::filesystem::path& folder);
[[nodiscard]] PolarizationSpec read_polarization(TomlReader reader, const std::filesystem::path& folder);
[[nodiscard]] IndexSpec read_index(TomlReader reader, const std::filesystem::path& folder);
[[nodiscard]] ValueOrMap read_curvature(TomlReader reader, const std::filesystem::path& folder,
                                        std::optional<ScatterSpec>& scatter);

/// Reads the keys that say how one column of a brightness map is laid out: column, hdu, ordering, frame,
/// unit.
void read_map_layout(TomlReader& reader, MapSource& source);

/// Reads `NAME_map`: a path, or an inline table with map, column, hdu, ordering and frame.
[[nodiscard]] std::optional<MapSource> read_named_map(TomlReader& reader, const std::string& key,
                                                      const std::string& section,
                                                      const std::filesystem::path& folder);

}  // namespace foreglow
