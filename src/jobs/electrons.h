// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <functional>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "jobs/row_format.h"
#include "model/electron_request.h"

namespace foreglow {

/// What `foreglow electrons` is asked for. Quantities are texts with units, as the command line has them.
struct ElectronsOptions {
    std::optional<double> slope, index, flux_index;  ///< one of them; the indices hold at `reference`
    std::optional<std::string> field, break_energy, cutoff_energy, age;
    ElectronRequest request;  ///< what has no unit: geometry, break_step, cutoff, aging, edge, redshift
    std::string reference = "408 MHz";
    std::vector<std::string> frequencies;  ///< "45 MHz", or "first:last:count" on a log grid; none: reference
    RowFormat format = RowFormat::Table;
};

/// Writes a row for each frequency as it is computed: brightness over that at the reference, index,
/// curvature, flux index, polarized fraction, energy that radiates there, and its lifetime.
/// @param write  takes text for standard output; returns false where no one reads any more, which ends the
/// job
/// @throws InputError where the request is wrong
void run_electrons(const ElectronsOptions& options, const std::function<bool(std::string_view)>& write);

}  // namespace foreglow
