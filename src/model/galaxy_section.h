// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include "io/toml_reader.h"
#include "model/galaxy_spec.h"

namespace foreglow {

/// Reads the section [galaxy] with [galaxy.electrons], [galaxy.field], [galaxy.gas] and [[galaxy.loop]]; what
/// is left out keeps its value, and loops that are given replace all four.
/// @throws InputError with place and key
[[nodiscard]] GalaxySpec read_galaxy(TomlReader reader);

}  // namespace foreglow
