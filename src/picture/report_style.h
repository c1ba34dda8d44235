// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <string>

namespace foreglow {

/// Returns the style sheet of the report page; the band at its top is the sequential palette.
[[nodiscard]] std::string make_report_style();

}  // namespace foreglow
