// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <filesystem>

namespace foreglow {

struct Plan;

/// What this machine has left [bytes]; the largest possible number where it does not say.
struct Resources {
    std::int64_t memory_bytes = 0;
    std::int64_t disk_bytes = 0;  ///< where `folder` is or would be
};
[[nodiscard]] Resources available_resources(const std::filesystem::path& folder);

/// Fills in the peak memory and the time that a plan wants, from the sizes of what is held at once and from
/// measured costs.
void estimate_costs(Plan& plan);

}  // namespace foreglow
