// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

namespace foreglow {

/// How rows come out: for a person, or for programs.
enum class RowFormat { Table, Csv, Json };

}  // namespace foreglow
