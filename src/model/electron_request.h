// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <functional>
#include <optional>
#include <string>

#include "physics/electron_law.h"

namespace foreglow {

enum class AgingWord { None, Continuous, Isotropized, FixedPitch };

/// What a user says about electrons, each value by itself good; a map may stand for three of them.
struct ElectronRequest {
    std::optional<double> field_uG, break_GeV, break_step, cutoff_GeV, age_Myr, redshift;
    std::optional<FieldGeometry> geometry;
    std::optional<CutoffShape> cutoff, edge;
    std::optional<AgingWord> aging;
    bool has_field_map = false, has_break_map = false, has_cutoff_map = false;
};

/// Refuses a key ("break_step"), which the caller names as its users know it. Must throw.
using RefuseKey = std::function<void(const std::string& key, const std::string& message)>;

/// Makes the law that a request describes.
/// @throws what refuse throws, where keys contradict each other or one is missing
[[nodiscard]] ElectronLaw make_electron_law(const ElectronRequest& request, const RefuseKey& refuse);

}  // namespace foreglow
