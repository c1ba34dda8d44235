// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <span>
#include <string>
#include <string_view>
#include <vector>

namespace foreglow {

/// A model file of the folder models/, built into the library.
struct BundledModel {
    std::string_view name;  ///< the file's stem
    std::string_view text;  ///< TOML
};

/// Returns the bundled models in alphabetical order.
[[nodiscard]] std::span<const BundledModel> list_bundled_models();

/// Returns the bundled model of that name, or nullptr.
[[nodiscard]] const BundledModel* find_bundled_model(std::string_view name);

/// Returns the bundled models' names.
[[nodiscard]] std::vector<std::string> list_bundled_names();

}  // namespace foreglow
