// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <string>

#include "base/progress.h"
#include "jobs/make_maps.h"
#include "jobs/plan.h"

namespace foreglow {

/// Makes the page that a person looks at first.
[[nodiscard]] std::string make_report(const Plan& plan, const SkyModel& sky, const MakeResult& result,
                                      const Progress& progress);

}  // namespace foreglow
