// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <optional>
#include <vector>

#include "io/fits_card.h"
#include "io/fits_map_write.h"
#include "jobs/plan.h"
#include "model/sky_model.h"

namespace foreglow {

/// Makes the complete layout of one channel's map: columns, units, and the cards of the interface page.
/// @param accuracy  reached
[[nodiscard]] FitsMapLayout make_channel_layout(const Plan& plan, const SkyModel& sky, const Channel& channel,
                                                int realization, double accuracy, bool with_beam = true);

/// Makes the layout of a truth map with the given columns.
/// @param realization  written as REALIZ where each realization has its own truth
[[nodiscard]] FitsMapLayout make_truth_layout(const Plan& plan, const SkyModel& sky,
                                              std::vector<FitsMapColumnName> columns, bool polarized,
                                              std::optional<int> realization = std::nullopt);

}  // namespace foreglow
