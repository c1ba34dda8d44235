// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <string>

namespace foreglow {

/// Returns the version of Foreglow, "0.1.0".
[[nodiscard]] std::string version();

/// Returns the compiler and the kind of build, for the manifest.
[[nodiscard]] std::string build_description();

}  // namespace foreglow
