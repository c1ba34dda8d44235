// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <string>

namespace foreglow {

/// Returns the bundled models, a line each: the name and the title.
[[nodiscard]] std::string list_models();

/// Returns a bundled model's text, which can be saved and used as a model file.
/// @throws InputError where there is none of that name; the nearest is named
[[nodiscard]] std::string print_model(const std::string& name);

}  // namespace foreglow
