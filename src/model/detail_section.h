// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <filesystem>
#include <optional>

#include "io/toml_reader.h"
#include "model/detail_spec.h"

namespace foreglow {

/// Reads [detail]; keys that contradict each other are refused.
/// @param folder  what the path of `spectrum` is relative to
/// @throws InputError with the place
[[nodiscard]] DetailSpec read_detail(TomlReader reader, const std::filesystem::path& folder);

/// Reads the keys of a scatter from [index] or [curvature]; nothing where there is none.
///
/// scatter, or decorrelation_length L in ln nu, which stands for scatter = 1/L: two frequencies then stay
/// correlated by exp(-(ln nu1/nu2)^2 / 2 L^2).
/// @param largest  rms that still makes sense
/// @throws InputError with the place
[[nodiscard]] std::optional<ScatterSpec> read_scatter(TomlReader& reader, double largest);

}  // namespace foreglow
