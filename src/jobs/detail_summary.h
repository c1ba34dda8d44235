// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include "io/json_value.h"
#include "jobs/make_maps.h"
#include "jobs/plan.h"
#include "picture/report_page.h"

namespace foreglow {

/// Adds what a report says of the structure below the template's beam: facts, and a chart of the spectra with
/// the fit and its range.
void add_detail(const Plan& plan, const MakeResult& result, ReportContent& page);

/// Describes it for run.json: fits with errors, what was drawn, what was cut.
[[nodiscard]] JsonValue describe_detail(const Plan& plan, const MakeResult& result);

}  // namespace foreglow
