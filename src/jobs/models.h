// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <string>

namespace foreglow {

/// Returns the bundled models, a line each: the name and the title.
[[nodiscard]] std::string list_models();

/// Returns a bundled model's text, which can be saved and used as a model file.
/// @throws InputError where there is none of that name; the nearest is named
[[nodiscard]] std::string print_model(const std::string& name);

/// Says where integrated maps of the Galaxy are kept and how much they take.
/// @throws InputError where no folder is known: neither $XDG_CACHE_HOME nor $HOME is set
[[nodiscard]] std::string describe_cache();

/// Removes them and says how much that was.
/// @throws InputError as above; FileError with the system's reason
[[nodiscard]] std::string empty_cache();

}  // namespace foreglow
